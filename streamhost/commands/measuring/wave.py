"""Audio that an instrument found."""

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from streamhost.measure.changes import Trace
from streamhost.measure.measuring import listening_gain


@dataclass(frozen=True, eq=False)
class Wave:
    """For a file of that name: samples (frames, channels), 1.0 = full scale."""

    name: str
    samples: NDArray[np.float64]


def change_waves(name: str, trace: Trace) -> Iterator[Wave]:
    """A change as it is heard, and its deviation raised to a peak of about -12 dBFS, if it has one."""
    yield Wave(name, trace.heard[:, None])
    deviation = trace.deviation
    peak = float(np.abs(deviation).max())
    gain = listening_gain(peak) if np.isfinite(peak) else None
    if gain is not None:
        said = f"raised-{gain}" if gain >= 0 else f"lowered-{-gain}"
        yield Wave(f"{name}-deviation-{said}-dB", deviation[:, None] * 10.0 ** (gain / 20.0))
