"""Limit cycles of a realization: bounds, proofs, searches; what a signal leaves behind; constant inputs."""

from collections.abc import Callable, Sequence
from math import isfinite

import numpy as np
from numpy.typing import NDArray

from streamhost.errors import RequestError
from streamhost.formats import Fixed
from streamhost.measure.cycles.assembling import proven_at_outputs, section_cycles
from streamhost.measure.cycles.ending import after_signals, default_signals
from streamhost.measure.cycles.results import Cycle, Ended, LimitCycles, SectionCycles, Stall
from streamhost.measure.cycles.sections import Effort, Examined, Report, examine, section_name
from streamhost.measure.cycles.seeded import anywhere
from streamhost.measure.cycles.stalls import LEVELS, LEVELS_QUICK, stalls
from streamhost.measure.cycles.whole import Whole
from streamhost.measure.levels import peak_dbfs
from streamhost.program.autonomous import driven_by_loops, has_lines, loops_of
from streamhost.realization import Realization

FLOATS = ("floating point: what is left when a signal ends dies out down to the subnormal numbers, and no limit cycle in this "
          "sense remains")
DITHERED = "dithered: the roundings differ from frame to frame, and no state comes back for that reason alone"
MOST_TOLD = 16
"""Cycles of the whole from seeded states that are told, the largest."""


def limit_cycles(
    realization: Realization, signals: Sequence[tuple[str, NDArray[np.float64]]] | None = None, *, seed: int = 1,
    quick: bool = False, report: Callable[[float, str], None] = lambda share, doing: None,
) -> LimitCycles:
    """Limit cycles that can be proven, or found from seeded states; what is left after signals; constant inputs.

    signals: (name, samples (frames,)) that are run before silence, the same in every channel; None for noise, tones and a
    recording. Interrupted by KeyboardInterrupt it gives what is done, with `complete` False.
    Raises RequestError for a seed that is none.
    """
    if not 0 <= seed < 1 << 62:
        raise RequestError(f"seed = {seed}: a seed of this search is a whole number from 0 to 2**62 - 1.")
    if reason := _refused(realization):
        return _nothing(reason, seed, quick)
    if not loops_of(realization.program):
        return _nothing("no loop: what it holds has left it when its memory has run out", seed, quick, proven=True)
    run = _Run(realization, signals, Effort.quick(seed) if quick else Effort(seed=seed), quick, report)
    run.all()
    return run.result()


def _refused(realization: Realization) -> str:
    if not isinstance(realization.format, Fixed):
        return FLOATS
    return DITHERED if any(quantizer.dither for quantizer in realization.program.quantizers) else ""


def _nothing(reason: str, seed: int, quick: bool, *, proven: bool = False) -> LimitCycles:
    lsb, bound = (0, 0.0) if proven else (None, None)
    return LimitCycles(proven, lsb, bound, lsb, None, lsb, None, lsb, None, None, reason, seed, quick, True)


class _Run:
    """Gathers what is found, task after task; interrupted, it keeps what it has."""

    def __init__(self, realization: Realization, signals: Sequence[tuple[str, NDArray[np.float64]]] | None, effort: Effort,
                 quick: bool, report: Report) -> None:
        self.realization, self.program, self.effort = realization, realization.program, effort
        self.signals, self.quick, self.report = signals, quick, report
        self.loops = [loop for loop in loops_of(self.program) if not has_lines(self.program, loop)]
        self.reasons = [f"{section_name(self.program, loop)} holds lines too long to be examined"
                        for loop in loops_of(self.program) if has_lines(self.program, loop)]
        self.sections: list[SectionCycles] = []
        self.ended: list[Ended] = []
        self.cycles: list[Cycle] = []
        self.stalls: list[Stall] = []
        self.proven: list[int] = []
        self.bounds: list[float] = []
        self.complete = False
        self.done = 0.0

    def all(self) -> None:
        try:
            for channel in range(self.program.diagram.channels):
                self.channel(channel)
            self.complete = all(section.complete for section in self.sections)
        except KeyboardInterrupt:
            pass

    def task(self, share: float) -> Report:
        """A report for a task that is such a share of one channel's work."""
        start, part = self.done, share / self.program.diagram.channels
        self.done += part
        return lambda inner, doing: self.report(start + part * min(1.0, inner), doing)

    def channel(self, channel: int) -> None:
        whole = None if has_lines(self.program, driven_by_loops(self.program)) else Whole(self.realization, channel)
        found: list[Examined] = []
        for loop in self.loops:
            task = self.task(0.7 / len(self.loops))
            found.append(examine(self.program, loop, channel, self.effort, task))
            self.sections.append(section_cycles(whole, self.program, found[-1], channel))
            if not found[-1].complete:
                raise KeyboardInterrupt
        lsb, reason = proven_at_outputs(whole, self.program, found, self.loops)
        if lsb is not None and not self.reasons:
            self.proven.append(lsb)
        self.reasons += [reason] if reason and reason not in self.reasons else []
        if whole is not None:
            self.outputs(whole, found)

    def outputs(self, whole: Whole, found: list[Examined]) -> None:
        if not self.realization.unstable:
            self.bounds.append(whole.bound)
        search = self.task(0.1)
        if len(found) > 1:
            self.cycles += self.from_states(whole, found, lambda share: search(share, "searching all sections together"))
        ending, holding = self.task(0.1), self.task(0.1)
        rate, seed = self.realization.rate, self.effort.seed
        signals = list(default_signals(rate, seed, self.quick)) if self.signals is None else list(self.signals)
        if signals:
            self.ended += after_signals(whole, signals, lambda share: ending(share, "after signals"))
        if not whole.takes_input:
            self.reasons.append("it holds long lines, and constant inputs were not tried")
        elif not self.realization.unstable:
            levels = LEVELS_QUICK if self.quick else LEVELS
            self.stalls += stalls(whole, levels, lambda share: holding(share, "constant inputs"))

    def from_states(self, whole: Whole, found: list[Examined], report: Callable[[float], None]) -> list[Cycle]:
        """The largest cycles of all sections together: from anywhere, and from where the cycles of each leave the others."""
        starts = [anywhere(whole.part.program, self.effort.lanes, self.effort.seed)]
        for each in found:
            worst = np.argsort(each.known.high.max(axis=0, initial=0))[::-1][:MOST_TOLD]
            starts.append(whole.embedded(each.part, each.known.states[:, worst]))
        landed = whole.land(np.hstack(starts), None, self.effort.steps, report)
        peaks = whole.peaks(landed).max(axis=0, initial=0)
        told: dict[tuple[int, int, bool], int] = {}
        for lane in np.argsort(peaks, kind="stable")[::-1]:
            key = (int(peaks[lane]), int(landed.found.period[lane]), bool(landed.found.lost[lane]))
            if key[1] and len(told) < MOST_TOLD:
                told.setdefault(key, int(lane))
        return [cycle for lane in told.values() if (cycle := whole.cycle("from a seeded state", landed, lane)) is not None]

    def result(self) -> LimitCycles:
        alone = [cycle for section in self.sections for cycle in (section.worst_granular, section.worst_overflow) if cycle]
        after = [ended.cycle for ended in self.ended if ended.cycle is not None]
        cycles = [*alone, *self.cycles, *after]
        granular, overflow = (_largest([cycle for cycle in cycles if cycle.overflows is over]) for over in (False, True))
        ended = _largest(after) if self.ended else None
        heard = [cycle for cycle in cycles if cycle.output_lsb is not None]
        proven = len(self.proven) == self.program.diagram.channels
        bound = max(self.bounds, default=None)
        off = [stall.off_lsb for stall in self.stalls if not stall.overflows]
        return LimitCycles(
            proven, max(self.proven) if proven else None, bound if bound is not None and isfinite(bound) else None,
            granular, self.dbfs(granular), overflow, self.dbfs(overflow), ended, self.dbfs(ended), max(off, default=None),
            "; ".join(self.reasons), self.effort.seed, self.quick, self.complete, tuple(self.sections), tuple(self.ended),
            tuple(self.cycles), tuple(self.stalls), max(heard, key=lambda cycle: cycle.output_lsb or 0, default=None),
            self.described(),
        )

    def described(self) -> tuple[tuple[str, str], ...]:
        whole = self.realization
        return (("form", whole.form), ("decomposition", whole.decomposition), ("format", whole.format.label),
                ("rate_hz", f"{whole.rate:g}"))

    def dbfs(self, lsb: int | None) -> float | None:
        assert isinstance(self.realization.format, Fixed), "a fixed-point program"
        return None if lsb is None else peak_dbfs(lsb * 2.0**-self.realization.format.output.word.fraction)


def _largest(cycles: Sequence[Cycle]) -> int:
    """At an output, in its steps; 0 of none."""
    return max((cycle.output_lsb or 0 for cycle in cycles), default=0)


