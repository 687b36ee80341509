"""What changes are tried on: excerpts side by side, the change at one frame of all."""

from dataclasses import dataclass
from itertools import cycle, islice

import numpy as np
from numpy.typing import NDArray

from streamhost.signals import dc, sine

FloatArray = NDArray[np.float64]

LEVEL_DBFS = -20.0
"""Peak of the tone, and the constant: as the noise on which limits are checked."""

PHASES = 4
PLACES = 8


@dataclass(frozen=True, eq=False)
class Excerpts:
    """Of one signal: x (frames, columns); `frames` says which frame of the signal the change is at in each column."""

    name: str
    x: FloatArray
    frames: tuple[int, ...] | None
    constant: bool = False


def constant(before: int, after: int, columns: int) -> Excerpts:
    """A constant of 0.1, the peak of the tone."""
    return Excerpts("constant", dc(before + after, 10.0 ** (LEVEL_DBFS / 20.0), columns), None, constant=True)


def tone(before: int, after: int, hertz: float, rate: float, columns: int | None) -> Excerpts:
    """A sine, changed where it rises through 0, at its peak and between; at its peak where there are columns for channels."""
    hertz = min(hertz, 0.45 * rate)
    turns = [(k / (2 * PHASES) - before * hertz / rate) % 1.0 for k in range(PHASES)]
    starts = [round(turn * rate / hertz) for turn in turns]
    whole = sine(before + after + max(starts), rate, hertz, LEVEL_DBFS)
    if columns is not None:
        return Excerpts(f"tone {hertz:.4g} Hz", np.repeat(whole[starts[2] :][: before + after], columns, axis=1), None)
    x = np.hstack([whole[start : start + before + after] for start in starts])
    return Excerpts(f"tone {hertz:.4g} Hz", x, None)


def recording(x: FloatArray, before: int, after: int, frame: int | None, columns: int | None) -> Excerpts:
    """A signal (frames, channels), changed at eight places spread over it, channels in turn, or in all channels at `frame`.

    Before its first frame and after its last there is silence. With columns for channels, at one place in all of them.
    """
    channels = x.shape[1]
    if frame is not None or columns is not None:
        place = frame if frame is not None else len(x) // 2
        places = [(place, channel) for channel in islice(cycle(range(channels)), columns or channels)]
    else:
        places = [((2 * k + 1) * len(x) // (2 * PLACES), k % channels) for k in range(PLACES)]
    held = np.hstack([_around(x[:, channel], place, before, after)[:, None] for place, channel in places])
    return Excerpts("recording", held, tuple(place for place, _ in places))


def _around(x: FloatArray, place: int, before: int, after: int) -> FloatArray:
    padded = np.concatenate([np.zeros(max(0, before - place)), x[max(0, place - before) : place + after]])
    return np.asarray(np.concatenate([padded, np.zeros(before + after - len(padded))]))
