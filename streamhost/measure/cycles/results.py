"""What is said of limit cycles. Amplitudes are the largest magnitude in a period, in steps of the word that is named or as
the peak in dBFS; a figure that is not given is None, with the reason beside it."""

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from streamhost.measure.cycles.boxes import Box
from streamhost.program.program import Program

CURVE = {"curve": True}
"""Metadata of a field that is for figures, or for other instruments, and no figure of the result itself."""


@dataclass(frozen=True)
class Cycle:
    """One limit cycle. `kind`: "dc" where every frame is like the one before, else "oscillation".

    `overflows`: something saturates or wraps in it: an overflow oscillation; else it is granular. `register`: the one in the
    section with the largest value. `state`: where it goes on from, in codes, of the section or of all, as `origin` says.
    `wave`: the output over a period or more, (frames,), 1.0 = full scale.
    """

    origin: str
    period_frames: int
    kind: str
    overflows: bool
    register: str
    section_lsb: int | None
    section_dbfs: float | None
    output: str
    output_lsb: int | None
    output_dbfs: float | None
    state: tuple[int, ...]
    wave: NDArray[np.float64] = field(default_factory=lambda: np.zeros(0), metadata=CURVE, compare=False, repr=False)


@dataclass(frozen=True)
class Listed:
    """Cycles of a section, of each one state in codes, (states, cycles).

    `high`: the largest magnitude of each of `nodes` in codes, (nodes, cycles); `overflows`: whether something does.
    """

    states: NDArray[np.int64]
    periods: NDArray[np.int64]
    nodes: tuple[int, ...]
    high: NDArray[np.int64]
    overflows: NDArray[np.bool_]


@dataclass(frozen=True)
class SectionCycles:
    """A section alone, without input.

    proven: every limit cycle in which nothing overflows is known, since all states within `proven_bound_lsb` were walked
    (`box_states` of them); `proven_lsb` is then the largest amplitude there is, 0 where there are none. With `proven_all` the
    walk went through every state that the words hold: overflow oscillations are among the known ones. `cycles` counts them.
    Else `found_lsb` is the largest of those found from `searched_states` seeded states, of which `unresolved_states` had
    not come back when the search ended. LSB are steps of `register`. `estimated_dead_band_lsb` is a formula, no guarantee.
    """

    name: str
    channel: int | None
    register: str
    word: str
    states: tuple[str, ...]
    proven: bool
    proven_all: bool
    reason: str
    proven_bound_lsb: float | None
    proven_lsb: int | None
    box_states: int | None
    cycles: int | None
    searched_states: int
    unresolved_states: int
    found_lsb: int
    found_dbfs: float
    estimated_dead_band_lsb: int | None
    estimated_period_frames: float | None
    worst_granular: Cycle | None
    worst_overflow: Cycle | None
    complete: bool
    program: Program = field(metadata=CURVE, compare=False, repr=False)
    box: Box | None = field(metadata=CURVE, compare=False, repr=False)
    known: Listed = field(metadata=CURVE, compare=False, repr=False)
    met: Listed = field(metadata=CURVE, compare=False, repr=False)


@dataclass(frozen=True)
class Ended:
    """What is left after a signal: `cycle` None where all is silent, from `after_frames` on at the latest.

    `reason` where it was not periodic yet when the search ended.
    """

    signal: str
    peak_dbfs: float
    channel: int | None
    after_frames: int
    cycle: Cycle | None
    reason: str


@dataclass(frozen=True)
class Stall:
    """A constant input that is held for ever, from rest or coming from a larger one.

    final_lsb: what the ideal filter comes to; off_lsb: the largest distance from it that remains; swing_lsb: half of peak to
    peak, 0 where the output stands still. In steps of the output's word, the input in steps of its own.
    """

    output: str
    channel: int | None
    input_lsb: int
    input_dbfs: float
    since: str
    final_lsb: float
    off_lsb: float
    swing_lsb: float
    period_frames: int
    overflows: bool


@dataclass(frozen=True)
class LimitCycles:
    """Limit cycles of a realization; amplitudes at the outputs, in steps of their word.

    proven_bound_lsb: no cycle without overflow is larger at an output, whatever its state. proven_lsb: the largest there is,
    given where all sections are proven and at most one has cycles and drives no other. Found, and kept apart:
    found_lsb, the largest granular one from any state; overflow_lsb, the largest overflow oscillation from any state;
    ended_lsb, the largest that a signal left behind; stall_lsb, the largest distance from its final value at which a
    constant input without overflow leaves an output. `reason`: why something is not given. `described`: of what all this is.
    """

    proven: bool
    proven_lsb: int | None
    proven_bound_lsb: float | None
    found_lsb: int | None
    found_dbfs: float | None
    overflow_lsb: int | None
    overflow_dbfs: float | None
    ended_lsb: int | None
    ended_dbfs: float | None
    stall_lsb: float | None
    reason: str
    seed: int
    quick: bool
    complete: bool
    sections: tuple[SectionCycles, ...] = ()
    after_signals: tuple[Ended, ...] = ()
    from_states: tuple[Cycle, ...] = ()
    stalls: tuple[Stall, ...] = ()
    worst: Cycle | None = None
    described: tuple[tuple[str, str], ...] = field(default=(), metadata=CURVE, compare=False, repr=False)
