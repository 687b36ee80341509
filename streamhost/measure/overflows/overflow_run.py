"""Registers against their words, by norms and by runs."""

from collections.abc import Callable, Iterator, Sequence
from math import inf

import numpy as np
from numpy.typing import NDArray

from streamhost.diagram.norms import settling_frames
from streamhost.formats import Fixed
from streamhost.measure.levels import decibels
from streamhost.measure.limits import SEED, limit_signal
from streamhost.measure.overflows.bounds import Bounds, bounds, fitting, proven, worst_input
from streamhost.measure.overflows.counting import Counts, counted
from streamhost.measure.overflows.places import Place, places
from streamhost.measure.overflows.recovering import Bursts, tail_frames
from streamhost.measure.overflows.result import Overflow, Recovery, Register
from streamhost.realization import Realization
from streamhost.signals import white

FloatArray = NDArray[np.float64]

MOST_BURSTS, QUICK_BURSTS = 4, 1
"""Worst cases that are run for what comes after them, of the registers with least headroom."""
BURST_FRAMES = 4096
LONGEST_BURST = 1 << 16
TRIALS, QUICK_TRIALS = 64, 16
LONGEST_TRIAL = 1 << 14
"""Frames that are listened to after each of many noises."""

NO_WORDS = "floating point has no registers that overflow"
UNSTABLE = "with its coefficients rounded the filter is not stable: it does not settle, whatever overflows"
NEVER = "no input within full scale can overflow a register"
NOT_MET = "no burst that was tried overflowed a register"


def overflow(
    realization: Realization, x: FloatArray | None = None, *, quick: bool = False, judged_only: bool = False,
    report: Callable[[float, str], None] = lambda share, doing: None,
) -> Overflow:
    """How full the registers of a realization can become, how often they overflow on a signal, and what comes after.

    x: (frames, channels), 1.0 = full scale; unless given, `limit_signal`. quick: one worst case is run instead of four, and
    for a shorter time. judged_only: norms and bounds, and no run at all. Of channels with coefficients of their own each
    register's worst is told.
    """
    if not isinstance(realization.format, Fixed):
        return Overflow(False, inf, "", 0, None, None, None, None, (), (), NO_WORDS, SEED, True)
    signal = limit_signal(realization.rate, realization.diagram.channels) if x is None else x
    try:
        report(0.0, "norms")
        counts = None if judged_only else counted(realization, signal)
        registers = _registers(realization, counts)
    except KeyboardInterrupt:
        return Overflow(False, -inf, "", 0, None, None, None, None, (), (), "broken off", SEED, False)
    recoveries, reason, complete = ([], "not asked for", True) if judged_only else _recoveries(
        realization, registers, signal, quick, report)
    return _summed_up(registers, recoveries, reason, complete)


def _registers(realization: Realization, counts: Counts | None) -> tuple[Register, ...]:
    program = realization.program
    there = places(program)
    by_channel = [bounds(program, there, channel) for channel in range(program.diagram.channels)]
    fits = [all(each) for each in zip(*(fitting(there, each) for each in by_channel), strict=True)]
    safe = proven(program, there, fits)
    return tuple(_register(realization, place, k, by_channel, counts, fits[k], safe[k]) for k, place in enumerate(there))


def _register(
    realization: Realization, place: Place, k: int, by_channel: Sequence[Bounds], counts: Counts | None, fits: bool,
    safe: bool,
) -> Register:
    channel = int(np.argmax([each.l1[k] for each in by_channel]))
    found = by_channel[channel]
    x, reaches = (None, None) if counts is None else worst_input(realization.program, place, channel)
    l1, peak = float(found.l1[k]), float(found.peak[k])
    told_apart = counts is not None and place.kind != "operand"
    first = int(counts.first[place.meter]) if counts is not None and told_apart else -1
    return Register(
        name=place.name, kind=place.kind, word=str(place.word), on_overflow=place.on_overflow,
        l1=l1, l2=float(found.l2[k]), peak=peak, bound=max(float(found.highest[k]), float(found.lowest[k])),
        largest=place.largest,
        headroom_bits=_headroom(place.largest, l1) / decibels(4.0),
        headroom_db=_headroom(place.largest, l1),
        sine_headroom_db=_headroom(place.largest, peak),
        fits=fits, proven=safe,
        overflows=int(counts.number[place.meter]) if counts is not None and told_apart else None,
        first_frame=first if first >= 0 else None,
        worst_reaches=reaches, worst_input=x,
    )


def _headroom(largest: float, value: float) -> float:
    return decibels((largest / value) ** 2) if value else inf


def _recoveries(
    realization: Realization, registers: Sequence[Register], signal: FloatArray, quick: bool,
    report: Callable[[float, str], None],
) -> tuple[list[Recovery], str, bool]:
    """What came after each burst that overflowed something, why there is nothing, and whether all bursts were run."""
    if all(register.proven for register in registers):
        return [], NEVER, True
    if realization.unstable:
        return [], UNSTABLE, True
    diagram = realization.program.diagram
    settling = max(settling_frames(diagram, channel) for channel in range(diagram.channels))
    frames = tail_frames(settling, quick=quick)
    tails = {"silence": np.zeros((frames, 1))}
    if not any(register.overflows for register in registers) and len(signal) >= frames:
        tails["signal"] = signal[:frames, : diagram.channels]
    found: list[Recovery] = []
    bursts, runs = list(_bursts(registers, quick)), Bursts(realization)
    try:
        for k, (name, burst) in enumerate(bursts):
            for after, tail in tails.items():
                report(0.1 + 0.9 * k / len(bursts), f"after {name}")
                heard = tail if burst.shape[1] == 1 else tail[:LONGEST_TRIAL]
                one = runs.recovery(name, burst, after, heard)
                found += [] if one is None else [one]
    except KeyboardInterrupt:
        return found, "", False
    return found, "" if found else NOT_MET, True


def _bursts(registers: Sequence[Register], quick: bool) -> Iterator[tuple[str, FloatArray]]:
    """Worst cases, tightest first; a constant, the two extremes in turn, and noises, all at full scale; (frames, trials)."""
    tight = sorted((each for each in registers if not each.fits and each.worst_input is not None),
                   key=lambda each: each.headroom_db)
    different = {x.tobytes(): (each.name, x) for each in reversed(tight) if (x := each.worst_input) is not None}
    for name, x in list(reversed(different.values()))[: QUICK_BURSTS if quick else MOST_BURSTS]:
        yield f"the worst case of {name}", x[-LONGEST_BURST:, None]
    yield "a constant", np.full((BURST_FRAMES, 1), -1.0)
    yield "the extremes in turn", np.where(np.arange(BURST_FRAMES) % 2, 1.0, -1.0)[:, None]
    yield "noise", white(BURST_FRAMES, QUICK_TRIALS if quick else TRIALS, SEED, 0.0)


def _summed_up(registers: tuple[Register, ...], recoveries: list[Recovery], reason: str, complete: bool) -> Overflow:
    tightest = min(registers, key=lambda each: each.headroom_db)
    slowest = max((one for one in recoveries if one.recovery_frames is not None),
                  key=lambda one: one.recovery_frames or 0, default=None)
    first = [each.first_frame for each in registers if each.first_frame is not None]
    return Overflow(
        proven=all(each.proven for each in registers),
        headroom_db=tightest.headroom_db, headroom_register=tightest.name,
        overflows=sum(each.overflows or 0 for each in registers), first_frame=min(first, default=None),
        oscillates=any(one.oscillates for one in recoveries) if recoveries else None,
        slowest_recovery_frames=slowest.recovery_frames if slowest is not None else None,
        slowest_recovery_s=slowest.recovery_s if slowest is not None else None,
        registers=registers, recoveries=tuple(recoveries), reason=reason, seed=SEED, complete=complete,
    )
