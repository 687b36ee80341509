"""One signal that enters a linear system and is watched at many exits: the shape of every question about norms.

Forwards it is an input seen at the nodes; backwards, on the transposed system, an output seen from the error sources.
"""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import cached_property
from itertools import islice

import numpy as np
from numpy.typing import NDArray

from streamhost.diagram.diagram import Diagram
from streamhost.diagram.graph import loops, reachable
from streamhost.diagram.rows import propagate

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]
BoolArray = NDArray[np.bool_]

MOST_DENSE = 200
"""States above which a frame is stepped along the nonzero entries, and no matrix is multiplied or factored."""

GROWTH = 1e-7
"""A pole further outside the unit circle than this grows; nearer, its own rounding could have put it there."""


@dataclass(frozen=True, eq=False)
class Fan:
    """Responses h[0] = direct, h[k] = exits A^(k-1) entry.

    A: (states, states), entry: (states,), exits: (exits, states), direct: (exits,).
    """

    A: FloatArray
    entry: FloatArray
    exits: FloatArray
    direct: FloatArray

    def pruned(self) -> "Fan":
        """Without the states that the entry does not reach or no exit sees."""
        there = reachable(_edges(self.A.T), np.flatnonzero(self.entry).tolist())
        back = reachable(_edges(self.A), np.flatnonzero(self.exits.any(axis=0)).tolist())
        return self.reduced(np.intersect1d(there, back).astype(np.intp))

    def reduced(self, states: NDArray[np.intp]) -> "Fan":
        """Only these states."""
        return Fan(self.A[np.ix_(states, states)], self.entry[states], self.exits[:, states], self.direct)

    def watched(self, exits: BoolArray) -> "Fan":
        """Only these exits, and the states they see."""
        return Fan(self.A, self.entry, self.exits[exits], self.direct[exits]).pruned()

    @cached_property
    def poles(self) -> ComplexArray:
        """The poles other than 0."""
        return np.concatenate([np.zeros(0, dtype=np.complex128), *(poles for _, poles in self._loops)])

    def without_growth(self) -> tuple["Fan", BoolArray]:
        """The fan without its unstable loops and all that they drive, and which exits see any of that."""
        unstable = [state for loop, poles in self._loops if np.abs(poles).max() > 1.0 + GROWTH for state in loop]
        grows = np.zeros(len(self.entry), dtype=np.bool_)
        grows[reachable(_edges(self.A.T), unstable)] = True
        return self.reduced(np.flatnonzero(~grows)), (self.exits[:, grows] != 0).any(axis=1)

    @cached_property
    def _loops(self) -> list[tuple[list[int], ComplexArray]]:
        """Each loop of states with its poles; taken apart, sections in cascade do not blur each other's.

        Loops of more than MOST_DENSE states are left out.
        """
        return [(loop, np.linalg.eigvals(self.A[np.ix_(loop, loop)]).astype(np.complex128))
                for loop in loops(_edges(self.A)) if len(loop) <= MOST_DENSE]


def from_input(diagram: Diagram, channel: int = 0, *, input: int = 0, nodes: Sequence[int] | None = None) -> Fan:
    """From an input to nodes, all of them where none are named."""
    rows = propagate(diagram, channel)
    watched = list(range(len(diagram.nodes)) if nodes is None else nodes)
    return Fan(rows.A, rows.B[:, input], rows.F[watched], rows.G[watched, input])


def from_errors(diagram: Diagram, sources: Sequence[int], nodes: Sequence[int], channel: int = 0) -> list[Fan]:
    """From the error of each source node to nodes."""
    rows, watched = propagate(diagram, channel, sources), list(nodes)
    return [Fan(rows.A, rows.N[:, k], rows.F[watched], rows.E[watched, k]) for k in range(len(sources))]


def to_output(diagram: Diagram, sources: Sequence[int], channel: int = 0, *, output: int = 0) -> Fan:
    """From the errors of the source nodes to an output, on the transposed system."""
    rows = propagate(diagram, channel, sources)
    node = diagram.outputs[output]
    return Fan(rows.A.T, rows.F[node], rows.N.T, rows.E[node])


def responses(fan: Fan, frames: int) -> FloatArray:
    """The impulse responses, shape (frames, exits)."""
    return run(fan, max(frames, 1))[0][:frames]


def run(fan: Fan, frames: int) -> tuple[FloatArray, FloatArray]:
    """The impulse responses, shape (frames, exits), and the states with which they go on, A^(frames-1) entry.

    `frames` is 1 or more.
    """
    result = np.empty((frames, len(fan.direct)))
    result[:1] = fan.direct
    done = 1
    for states in state_blocks(fan.A, fan.entry, frames):
        taken = states[:, :frames - done]
        result[done:done + taken.shape[1]] = (fan.exits @ taken).T
        done += taken.shape[1]
        if taken.shape[1] < states.shape[1]:
            return result, states[:, taken.shape[1]]
    raise AssertionError("the states go on without end")


def state_blocks(A: FloatArray, entry: FloatArray, frames: int) -> Iterator[FloatArray]:
    """The states A^k entry, k = 0, 1, ..., without end, in blocks (states, a power of two not above 4096)."""
    block = 1 << min(frames.bit_length(), 12)
    if len(entry) > MOST_DENSE:
        steps = _stepped(A, entry)
        while True:
            yield np.array(list(islice(steps, block))).T
    states, power = entry[:, None], A
    while states.shape[1] < block:
        states, power = np.hstack((states, power @ states)), power @ power
    while True:
        yield states
        states = power @ states


def impulse_response(diagram: Diagram, channel: int = 0, *, input: int = 0, frames: int) -> FloatArray:
    """From an input to the outputs, shape (frames, outputs)."""
    return responses(from_input(diagram, channel, input=input, nodes=diagram.outputs), frames)


def _stepped(A: FloatArray, state: FloatArray) -> Iterator[FloatArray]:
    rows, columns = np.nonzero(A)
    weights = A[rows, columns]
    while True:
        yield state
        state = np.bincount(rows, weights * state[columns], minlength=len(state)).astype(np.float64)


def _edges(A: FloatArray) -> list[list[int]]:
    """For each row, the columns that are not 0: what each state reads; of A transposed, what each state drives."""
    return [np.flatnonzero(row).tolist() for row in A]
