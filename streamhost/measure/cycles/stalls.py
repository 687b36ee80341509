"""Constant inputs that are held for ever: where the output comes to rest, or swings, beside its final value."""

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from streamhost.diagram.nodes import Input
from streamhost.formats import Fixed
from streamhost.measure.cycles.ending import channel_number
from streamhost.measure.cycles.results import Stall
from streamhost.measure.cycles.search import Landed
from streamhost.measure.cycles.whole import Whole
from streamhost.measure.levels import peak_dbfs

Integers = NDArray[np.int64]

LEVELS, LEVELS_QUICK = 24, 8
LARGEST = 0.25
"""Of full scale: twice as much comes before it, and most filters still carry that."""

STEPS_EACH = 1 << 21


def levels_of(bits: int, count: int) -> Integers:
    """Codes of both signs, evenly spaced by their logarithm from 1 to a quarter of full scale, without repetition."""
    largest = max(1, int(LARGEST * 2.0 ** (bits - 1)))
    levels = np.unique(np.rint(np.geomspace(1, largest, count)).astype(np.int64))
    return np.concatenate((levels, -levels))


def stalls(whole: Whole, count: int, report: Callable[[float], None]) -> tuple[Stall, ...]:
    """Every level from rest, and from where twice as much had led; levels that came to no period are left out."""
    format = whole.program.format
    assert isinstance(format, Fixed) and whole.takes_input, "a fixed-point program with its input"
    inputs = levels_of(format.input.word.bits, count)
    steps = STEPS_EACH * len(inputs)
    rest = np.zeros((len(whole.part.words), len(inputs)), np.int64)
    first = whole.land(rest, inputs, steps, lambda share: report(share / 3))
    twice = np.clip(2 * inputs, format.input.word.low, format.input.word.high)
    above = whole.land(rest, twice, steps, lambda share: report((1 + share) / 3))
    second = whole.land(above.states, inputs, steps, lambda share: report((2 + share) / 3))
    found: list[Stall] = []
    for since, landed in (("from rest", first), ("from twice as much", second)):
        found += _told(whole, inputs, since, landed)
    return tuple(found)


def _told(whole: Whole, inputs: Integers, since: str, landed: Landed) -> list[Stall]:
    format = whole.program.format
    assert isinstance(format, Fixed), "a fixed-point program"
    high, low = whole.output_codes(landed)
    gains = final_gains(whole) * 2.0 ** (whole.fraction - format.input.word.fraction)
    found = []
    for output, gain in enumerate(gains):
        for lane in np.flatnonzero(landed.found.period > 0):
            final = gain * inputs[lane]
            top, bottom = int(high[output, lane]), int(low[output, lane])
            found.append(Stall(
                whole.name(output), channel_number(whole), int(inputs[lane]),
                peak_dbfs(abs(int(inputs[lane])) * 2.0**-format.input.word.fraction), since, float(final),
                float(max(abs(top - final), abs(bottom - final))), (top - bottom) / 2, int(landed.found.period[lane]),
                bool(landed.found.lost[lane]),
            ))
    return found


def final_gains(whole: Whole) -> NDArray[np.float64]:
    """What a constant input of 1 leads to at each output, with the coefficients as stored and no rounding, (outputs,)."""
    program = whole.part.program
    assert any(isinstance(node, Input) for node in program.nodes), "it has an input"
    space = program.diagram.state_space(whole.channel)
    settled = np.linalg.solve(np.eye(len(space.A)) - space.A, space.B)
    gains: NDArray[np.float64] = (space.C @ settled + space.D)[:, 0]
    return gains
