"""The audio around a change, read from the rings that the step fills."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from streamhost.host.shared import Shared


@dataclass(frozen=True, eq=False)
class Capture:
    """From `first`, counted from the change, which is 0: what was heard, and the two lanes' own outputs, (frames, columns)."""

    first: int
    heard: NDArray[np.float64]
    before: NDArray[np.float64]
    after: NDArray[np.float64]


def captured(shared: Shared, frame: int, lanes: tuple[int, int], *, before: int, after: int, block: int,
             begins: int = 0) -> Capture | None:
    """Around a change at a frame of the run from one lane to another; None as long as it has not all been run.

    None also where the step, which may be up to `block` frames ahead of what it says, has come round the ring meanwhile.
    """
    length, absolute = len(shared.heard), begins + frame
    first, last = max(absolute - before, begins), absolute + after
    if int(shared.meters["frame"][0]) < last or last - first > length:
        return None
    rows = np.arange(first, last) % length
    found = [np.array(ring[rows]) for ring in (shared.heard, shared.outputs[lanes[0]], shared.outputs[lanes[1]])]
    if int(shared.meters["frame"][0]) - first > length - block:
        return None
    return Capture(first - absolute, *found)
