"""Every limit cycle in a box of states, found by walking all of it."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from streamhost.cache import load_module
from streamhost.measure.cycles.boxes import Box
from streamhost.program.native.kernel import SIGNATURE
from streamhost.program.native.walk import print_walk
from streamhost.program.program import Program

Integers = NDArray[np.int64]

MOST_STATES, MOST_STATES_QUICK = 200_000_000, 4_000_000
"""Of a box that is walked: a byte a state."""

MOST_CYCLES = 1 << 20
STRETCH = 1 << 19
"""Points between two reports."""


@dataclass(frozen=True, eq=False)
class Exhausted:
    """One state of each cycle in the box, (states, cycles), in order of the walk; whether all of the box was walked."""

    states: Integers
    complete: bool


def exhaust(program: Program, box: Box, channel: int, report: Callable[[float], None]) -> Exhausted:
    """Walk a box; interrupted, or with more than MOST_CYCLES, give what was found."""
    assert program.stored is not None, "a fixed-point program"
    kernel = load_module(print_walk(program), f"walk {program.format.label}").kernel
    call = SIGNATURE(kernel.address)
    marks, found = np.zeros(box.states, np.uint8), np.zeros(MOST_CYCLES + 1, np.int64)
    codes = [row[min(channel, len(row) - 1)] for row in program.stored.codes]
    transform, inverse = np.ascontiguousarray(box.transform), np.ascontiguousarray(box.inverse)
    coefficients, limits = np.array(codes or [0], np.int64), np.array(box.limits, np.int64)
    words = np.array(box.words, np.int64)
    complete = False
    try:
        for first in range(0, box.states, STRETCH):
            report(first / box.states)
            last = min(first + STRETCH, box.states)
            at = coordinates_of(box, np.array([first]))
            arrays = (transform, inverse, at, coefficients, limits, found, marks, words)
            call(*(array.ctypes.data for array in arrays), first, last, MOST_CYCLES)
        complete = bool(found[0] < MOST_CYCLES)
    except KeyboardInterrupt:
        pass
    return Exhausted(states_of(box, found[1 : found[0] + 1]), complete)


def states_of(box: Box, points: Integers) -> Integers:
    """The states, (states, points), of points given by their numbers."""
    return box.inverse @ coordinates_of(box, points)


def coordinates_of(box: Box, points: Integers) -> Integers:
    """u = T x of points given by their numbers, (states, points)."""
    coordinates, rest = np.empty((len(box.limits), len(points)), np.int64), points
    for i in reversed(range(len(box.limits))):
        side = 2 * box.limits[i] + 1
        coordinates[i], rest = rest % side - box.limits[i], rest // side
    return coordinates
