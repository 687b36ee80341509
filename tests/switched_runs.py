"""A changeover between two realizations at a frame, beside the target that has run all along."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from streamhost.host.engine import BLOCK, Host
from streamhost.host.lane import Lane
from streamhost.host.plan import Change
from streamhost.realization import Realization


@dataclass(frozen=True, eq=False)
class Switched:
    """Outputs (frames, outputs * channels): of the run with the change, of the realization before had it gone on, and of
    the target had it run all along. `clipped`: carried states that did not fit their word."""

    output: NDArray[np.float64]
    before: NDArray[np.float64]
    target: NDArray[np.float64]
    clipped: int


def switched(
    before: Realization, after: Realization, x: NDArray[np.float64], frame: int, changeover: str, *,
    fade_frames: int | None = None, block: int = BLOCK,
) -> Switched:
    """Run x (frames, channels) through `before` and from `frame` on through `after`, whose state is by `changeover`.

    Neither realization's own state is touched. Raises RequestError as a host does for a change that cannot be.
    """
    channels = x.shape[1]
    lanes = [Lane(before, channels), Lane(after, channels), Lane(after, channels)]
    host = Host(lanes, block)
    host.plan.change(Change(frame, 1, changeover), fade_frames=fade_frames)
    width = host.outputs * channels
    found = [np.empty((len(x), width)) for _ in range(3)]
    for start in range(0, len(x), block):
        part = slice(start, min(start + block, len(x)))
        host.step(x[part])
        for into, given in zip(found, (host.heard_block, lanes[0].output, lanes[2].output), strict=True):
            into[part] = given
    return Switched(found[0], found[1], found[2], sum(change.clipped for change in host.plan.changed))
