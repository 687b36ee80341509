"""States to begin a search from: the same for the same seed, on every machine."""

import numpy as np
from numpy.typing import NDArray

from streamhost.diagram.nodes import Delay
from streamhost.measure.cycles.boxes import Box
from streamhost.program.program import Program
from streamhost.signals import random_words

Integers = NDArray[np.int64]


def words_of(program: Program) -> tuple[tuple[int, int], ...]:
    """The lowest and highest code of each state of a part."""
    bounds = [program.numbers[index].bound for index, node in enumerate(program.nodes) if isinstance(node, Delay)]
    return tuple((-bound, bound - 1) for bound in bounds)


def anywhere(program: Program, lanes: int, seed: int) -> Integers:
    """States, (states, lanes), uniform over all that the words hold."""
    return _uniform(list(words_of(program)), lanes, seed)


def inside(box: Box, lanes: int, seed: int) -> Integers:
    """States, (states, lanes), uniform over a box; what lies outside a word is moved to its end."""
    points = _uniform([(-limit, limit) for limit in box.limits], lanes, seed)
    low, high = (np.array(ends, np.int64)[:, None] for ends in zip(*box.words, strict=True))
    states: Integers = np.clip(box.inverse @ points, low, high)
    return states


def _uniform(ranges: list[tuple[int, int]], lanes: int, seed: int) -> Integers:
    rows = np.empty((len(ranges), lanes), np.int64)
    for row, ((low, high), start) in enumerate(zip(ranges, random_words(seed, len(ranges)), strict=True)):
        bits = (random_words(int(start), lanes) >> np.uint64(1)).astype(np.int64)
        rows[row] = bits if high - low >= 1 << 63 else low + bits % (high - low + 1)
    return rows
