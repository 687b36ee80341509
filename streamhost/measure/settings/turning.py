"""Many turns of knobs at once by `keep`: columns of one kernel are pairs of settings, each with its own coefficients."""

import copy
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from math import isfinite

import numpy as np
from numpy.typing import NDArray

from streamhost.measure.changes.figures import figures
from streamhost.measure.changes.signals import Excerpts, constant, tone
from streamhost.program.native.kernel import Memory, Variant, compile_kernel, kernel_width, no_marks, no_trace
from streamhost.realization import Realization

FloatArray = NDArray[np.float64]

SHORTEST_S, LONGEST_S = 0.1, 2.0
BEYOND = 1.5
"""Settling times that are listened to after a turn."""

MOST_SAMPLES = 1 << 22
"""Of one run: so many frames times columns at most are held in memory."""


@dataclass(frozen=True, eq=False)
class Pair:
    """Two realizations of one diagram and one set of words. hertz: of the tone. settling: frames, of the slower."""

    first: Realization
    second: Realization
    hertz: float
    settling: float


@dataclass(frozen=True)
class Turned:
    """Of one pair: the largest deviation and click, 1.0 = full scale, and on which signal the click was."""

    peak: float
    click: float
    signal: str


def lengths(settling: float, rate: float) -> tuple[int, int]:
    """Frames before a turn and after it."""
    most = LONGEST_S * rate
    held = settling if isfinite(settling) else most
    return round(min(max(held, SHORTEST_S * rate), most)), round(min(max(BEYOND * held, SHORTEST_S * rate), most))


def signals_of(pair: Pair, before: int, after: int) -> list[Excerpts]:
    """What one pair is tried on: a constant, and a tone at four phases."""
    channels = pair.first.diagram.channels
    return [constant(before, after, channels),
            tone(before, after, pair.hertz, pair.first.rate, channels if channels > 1 else None)]


def turned_all(pairs: Sequence[Pair]) -> Iterator[Turned]:
    """Each pair in turn, several in one run. All have one rate, all first ones one kernel, and all second ones."""
    while pairs:
        before, after = lengths(max(pair.settling for pair in pairs), pairs[0].first.rate)
        columns = sum(each.x.shape[1] for each in signals_of(pairs[0], 1, 1))
        count = max(1, MOST_SAMPLES // ((before + after) * columns))
        yield from _together(pairs[:count], before, after)
        pairs = pairs[count:]


def _together(pairs: Sequence[Pair], before: int, after: int) -> Iterator[Turned]:
    tried = [signals_of(pair, before, after) for pair in pairs]
    x = np.hstack([excerpts.x for each in tried for excerpts in each])
    widths = [[excerpts.x.shape[1] for excerpts in each] for each in tried]
    first = _memory([pair.first for pair in pairs], [sum(each) for each in widths])
    kept = _memory([pair.second for pair in pairs], [sum(each) for each in widths])
    target = copy.deepcopy(kept)
    run, run_first = (_runner(each, x.shape[1]) for each in (pairs[0].second, pairs[0].first))
    run_first(first, x[:before])
    run(target, x[:before])
    kept.state[:], kept.frame = first.state, first.frame
    with np.errstate(over="ignore", invalid="ignore"):
        deviation = run(kept, x[before:]) - run(target, x[before:])
    told = figures(deviation, 0.0, pairs[0].first.rate)
    outputs = len(pairs[0].first.outputs)
    peak, click = (each.reshape(outputs, -1).max(axis=0) for each in (told.peak, told.click))
    yield from _split(peak, click, tried)


def _runner(realization: Realization, columns: int) -> Callable[[Memory, FloatArray], FloatArray]:
    program = realization.program
    kernel = compile_kernel(program, Variant(width=kernel_width(program, columns)))

    def run(memory: Memory, given: FloatArray) -> FloatArray:
        y = np.empty((len(given), len(program.diagram.outputs) * columns))
        kernel.call(memory, np.ascontiguousarray(given), y, marks=no_marks(), trace=no_trace())
        return y

    return run


def _split(peak: FloatArray, click: FloatArray, tried: Sequence[Sequence[Excerpts]]) -> Iterator[Turned]:
    """The figures of the columns, by pair."""
    begins = 0
    for each in tried:
        by_signal = []
        for excerpts in each:
            columns = slice(begins, begins + excerpts.x.shape[1])
            by_signal.append(Turned(float(peak[columns].max()), float(click[columns].max()), excerpts.name))
            begins = columns.stop
        worst = max(by_signal, key=lambda one: one.click)
        yield Turned(max(one.peak for one in by_signal), worst.click, worst.signal)


def _memory(realizations: Sequence[Realization], widths: Sequence[int]) -> Memory:
    """Of zero state, each realization's coefficients in as many columns as it has; channels take theirs in turn."""
    channels = realizations[0].diagram.channels
    each = [realization.memory(channels) for realization in realizations]
    memory = each[0]
    memory.channels = sum(widths)
    memory.coefficients = np.ascontiguousarray(
        np.hstack([np.tile(one.coefficients, width // channels) for one, width in zip(each, widths, strict=True)]))
    memory.state = np.zeros((len(memory.state), memory.channels), memory.state.dtype)
    memory.keys = np.ascontiguousarray(np.tile(memory.keys, memory.channels // channels))
    return memory
