"""Which frames of a run count: those after the settling time, and not soon after an overflow."""

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

NEVER = -(1 << 62)


class Counting:
    """Of one channel, block after block. A frame within `settling` frames from an overflow on does not count."""

    def __init__(self, settling: int) -> None:
        self._settling = settling
        self._frame, self._overflow = 0, NEVER
        self.settled = self.excluded = 0

    def take(self, marks: NDArray[np.uint8]) -> NDArray[np.bool_]:
        """Which of the next frames count, (frames,); marks are 1 where something overflowed."""
        frames = self._frame + np.arange(len(marks))
        last = np.maximum.accumulate(np.where(marks != 0, frames, self._overflow))
        settled = frames >= self._settling
        disturbed = settled & (frames - last < self._settling)
        if len(marks):
            self._frame, self._overflow = self._frame + len(marks), int(last[-1])
        self.settled += int(settled.sum())
        self.excluded += int(disturbed.sum())
        return settled & ~disturbed


def stretches(counts: NDArray[np.bool_]) -> Iterator[tuple[int, int]]:
    """First frame and end of every stretch of frames that count."""
    edges = np.flatnonzero(np.diff(np.concatenate(([False], counts, [False])).astype(np.int8)))
    yield from zip(edges[::2].tolist(), edges[1::2].tolist(), strict=True)
