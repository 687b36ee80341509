"""The working memory of a kernel as real states, newest first as the linear analysis counts them, and back."""

from collections.abc import Iterator
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from streamhost.program.program import Program

if TYPE_CHECKING:
    from streamhost.program.native.kernel import Memory

FloatArray = NDArray[np.float64]


def read_states(program: Program, memory: "Memory") -> FloatArray:
    """(states, channels) in real values, 1.0 = full scale."""
    values = np.zeros((program.state_words, memory.channels))
    for source, state, place in _places(program, memory.frame):
        step = 2.0 ** -program.numbers[source].fraction if program.numbers else 1.0
        values[state] = memory.state[place] * step
    return values


def write_states(program: Program, memory: "Memory", values: FloatArray) -> int:
    """Put real states (states, channels) into the memory: half-even, saturating. Returns how many did not fit."""
    clipped = 0
    for source, state, place in _places(program, memory.frame):
        if not program.numbers:
            memory.state[place] = values[state].astype(program.types[source])
            continue
        number = program.numbers[source]
        for channel, value in enumerate(values[state]):
            code = _code(float(value), number.fraction)
            held = min(max(code, -number.bound), number.bound - 1)
            clipped += held != code
            memory.state[place, channel] = held
    return clipped


def _code(value: float, fraction: int) -> int:
    """Half-even, in integers of any size."""
    numerator, denominator = value.as_integer_ratio()
    shifted = numerator << fraction if fraction >= 0 else numerator
    whole, rest = divmod(shifted, denominator if fraction >= 0 else denominator << -fraction)
    twice = 2 * rest - (denominator if fraction >= 0 else denominator << -fraction)
    return whole + (twice > 0 or (twice == 0 and whole % 2 == 1))


@dataclass(frozen=True)
class Ring:
    """Where a state lies: what is stored, and the line of `stores` words from row `offset` that turns with the frames.

    `k`: frames before the newest.
    """

    source: int
    offset: int
    stores: int
    k: int

    def row(self, frame: int) -> int:
        """A line is a ring that was written last in the frame before."""
        return self.offset + (frame - 1 - self.k) % self.stores


def rings(program: Program) -> Iterator[Ring]:
    """Of every state, in their order."""
    for node, offset in program.state_offsets.items():
        stores, (source,) = program.nodes[node].stores, program.nodes[node].reads
        for k in range(stores):
            yield Ring(source, offset, stores, k)


def _places(program: Program, frame: int) -> Iterator[tuple[int, int, int]]:
    """(what is stored, state, row of the memory)."""
    for state, ring in enumerate(rings(program)):
        yield ring.source, state, ring.row(frame)
