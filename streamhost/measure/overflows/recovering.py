"""What comes after an overflow: the run joins its ideal again, or oscillates."""

from math import isfinite

import numpy as np
from numpy.typing import NDArray

from streamhost.measure.levels import peak_dbfs
from streamhost.measure.overflows.bounds import error_bounds
from streamhost.measure.overflows.result import Recovery
from streamhost.measure.running import Run
from streamhost.realization import Realization

FloatArray = NDArray[np.float64]

SHORTEST_TAIL, LONGEST_TAIL = 1 << 12, 1 << 17
SETTLINGS = 4
LONGEST_PERIOD = 1 << 12
STILL = 0.5
"""Of the peak a quarter of the run before: an oscillation that shrank to less is still dying out."""
NEGLIGIBLE = 1e-12
"""What the ideal's own rounding may add."""


def tail_frames(settling: float, *, quick: bool) -> int:
    """How long is listened after a burst: some settling times, within bounds."""
    most = LONGEST_TAIL >> 2 if quick else LONGEST_TAIL
    return int(min(max(SETTLINGS * settling, SHORTEST_TAIL), most)) if isfinite(settling) else most


class Bursts:
    """Runs bursts through a realization and its ideal, each from zero state."""

    def __init__(self, realization: Realization) -> None:
        self._realization, self._columns = realization, realization.diagram.channels
        self._runs: dict[int, Run] = {}
        self._allowed = allowed_difference(realization)

    def recovery(self, name: str, burst: FloatArray, after: str, tail: FloatArray) -> Recovery | None:
        """What came after a burst (frames, trials), then a tail (frames, 1 or channels); None where nothing overflowed in it.

        Trials are run side by side, and the worst of them is told: one that oscillates, or took longest. Where channels have
        coefficients of their own, there is one trial, the same in all of them.
        """
        if self._columns > 1:
            burst = np.repeat(burst[:, :1], self._columns, axis=1)
        channels = burst.shape[1]
        run = self._runs.setdefault(channels, Run(self._realization, channels))
        run.reset()
        first = run.step(burst)
        last = run.step(np.ascontiguousarray(np.broadcast_to(tail, (len(tail), channels))))
        trials = np.flatnonzero(first.marks.any(axis=0))
        if not len(trials):
            return None
        allowed = np.broadcast_to(self._allowed, (len(self._allowed), channels))
        beyond = np.any(np.abs(last.difference) > allowed, axis=1)
        joined = np.where(beyond.any(axis=0), len(tail) - np.argmax(beyond[::-1], axis=0), 0)
        late = [np.abs(part).max(axis=(0, 1)) for part in np.array_split(last.difference, 4)[2:]]
        oscillating = (joined == len(tail)) & ~(late[1] < STILL * late[0])
        worst = int(max(trials, key=lambda trial: (oscillating[trial], joined[trial], late[1][trial])))
        tally, frames = run.tally(), int(joined[worst])
        recovered, oscillates = frames < len(tail), bool(oscillating[worst])
        period = _period(last.output[-len(tail) // 4 :, :, worst]) if oscillates and after == "silence" else None
        return Recovery(
            burst=name, after=after, trials=len(trials), oscillating=int(oscillating[trials].sum()),
            overflows=tally.saturations + tally.wraps + tally.accumulator_overflows,
            allowed_dbfs=peak_dbfs(float(self._allowed.max())),
            recovery_frames=frames if recovered else None,
            recovery_s=frames / self._realization.rate if recovered else None,
            oscillates=oscillates, period_frames=period, peak_dbfs=peak_dbfs(float(late[1][worst])),
            burst_frames=len(burst),
            difference=np.concatenate((first.difference[:, :, worst], last.difference[:, :, worst])),
        )


def allowed_difference(realization: Realization) -> FloatArray:
    """What roundings alone can make of the difference, (outputs, channels of the coefficients)."""
    program = realization.program
    outputs = list(program.diagram.outputs)
    return np.array([error_bounds(program, outputs, channel) for channel in range(program.diagram.channels)]).T + NEGLIGIBLE


def _period(output: FloatArray) -> int | None:
    """The shortest period of what is put out, (frames, outputs); None where there is none of up to 4096 frames."""
    for period in range(1, min(LONGEST_PERIOD, len(output) // 2) + 1):
        if np.array_equal(output[period:], output[:-period]):
            return period
    return None
