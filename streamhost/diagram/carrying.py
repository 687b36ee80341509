"""The state of one diagram that continues the output of another.

Without input a state x gives the outputs C A^k x, k = 0, 1, ... The state of the diagram that takes over is the one whose
outputs are nearest to those of the diagram before it, in the least squares over a finite horizon: until both have died,
at most two seconds, so that poles on the circle are no special case. Rows are taken one by one at first, then evenly
spaced and weighted by about the root of the spacing, and made in double-double: for poles near z = 1 powers of A grow by
many digits before they die. Gramians and a Sylvester equation, the textbook's way, lose all digits there.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from math import log

import numpy as np
from numpy.typing import NDArray

from streamhost.diagram.diagram import Diagram
from streamhost.diagram.doubled import Doubled, doubled, krylov, power, squares
from streamhost.diagram.linear import StateSpace
from streamhost.diagram.nodes import Delay, Input, Residue, Round, Taps

FloatArray = NDArray[np.float64]

MOST_ROWS, LEAST_ROWS, ROWS_A_STATE = 4096, 1024, 16
"""Frames that are looked at; an eighth of them are the first ones."""

LONGEST_S = 2.0
DEAD = 1e-13
"""Of its size at the start: a response is taken to have died when that much is left."""

RELATIVE_RANK = 1e-13

MOST_STEPS, LAST_STEP = 8, 1e-12
"""Steps of a solution at most, and the share of it below which a step is the last: the next would be its square."""


@dataclass(frozen=True)
class Frames:
    """The frames that are looked at: so many close ones, one by one, then so many that are `spacing` apart."""

    close: int
    spacing: int
    spaced: int

    def weights(self, outputs: int) -> FloatArray:
        """The weight of each row of `outputs_alone`: the power of two next to the root of the spacing, which rounds nothing."""
        return np.repeat([1.0, _power_of_two(np.sqrt(self.spacing))], [self.close * outputs, self.spaced * outputs])


@dataclass(frozen=True)
class Continuation:
    """x2 = M x1: the state that continues, from the state before; `rest` @ x1 is what the output then lacks.

    M: (states of the next, states before); rest: (rows, states before), at the frames that were looked at.
    """

    M: Doubled
    rest: Doubled

    def state(self, before: FloatArray) -> FloatArray:
        """(states of the next, channels) from (states before, channels)."""
        return (self.M @ doubled(before)).high

    def missed(self, before: FloatArray) -> float:
        """The largest deviation of the output, over the frames looked at, from what would have come."""
        return float(np.abs((self.rest @ doubled(before)).high).max(initial=0.0))


def continuation(before: Doubled, following: Doubled, weights: FloatArray) -> Continuation:
    """From the zero-input outputs of unit states, (rows, states) of each diagram at the same frames.

    Columns are scaled to a norm near 1; O2 = QR; the singular value decomposition of R, where singular values below 1e-13
    of the largest count as 0, solves for M. A state before may be one that no input makes, whose output this diagram cannot
    continue, and only many together make what it can: solution and rest are refined together in double-double.
    Source: Å. Björck, Iterative refinement of linear least squares solutions I, BIT 7, 1967.
    """
    scales = _power_of_two(np.linalg.norm(following.high * weights[:, np.newaxis], axis=0))
    O1, O2 = before.scaled(rows=weights), following.scaled(rows=weights, columns=1.0 / scales)
    Q, R = np.linalg.qr(O2.high)
    U, s, Vt = np.linalg.svd(R, full_matrices=False)
    rank = int(np.sum(s > RELATIVE_RANK * s[0])) if len(s) else 0
    Q, s, Vt = Q @ U[:, :rank], s[:rank, np.newaxis], Vt[:rank]
    M, rest = doubled(np.zeros((O2.high.shape[1], O1.high.shape[1]))), doubled(np.zeros_like(O1.high))
    lacks, along, turned = O1, np.zeros((rank, O1.high.shape[1])), O2.transposed()
    for _ in range(MOST_STEPS):
        within = Q.T @ lacks.high
        step = Vt.T @ ((within - along) / s)
        M, rest = M + doubled(step), rest + doubled(lacks.high + Q @ (along - within))
        left = O1 + -(O2 @ M)
        if np.all(np.linalg.norm(step, axis=0) <= LAST_STEP * np.linalg.norm(M.high, axis=0)):
            break
        lacks, along = left + -rest, -(Vt @ (turned @ rest).high) / s
    return Continuation(M.scaled(rows=1.0 / scales), left.scaled(rows=1.0 / weights))


def looked_at(spaces: Sequence[StateSpace], rate: float) -> Frames:
    """Until all have died, at most two seconds."""
    count = min(MOST_ROWS, max(LEAST_ROWS, ROWS_A_STATE * sum(len(space.A) for space in spaces)))
    longest, close = int(LONGEST_S * rate), count // 8
    slowest = max((float(np.abs(np.linalg.eigvals(space.A)).max(initial=0.0)) for space in spaces), default=0.0)
    if slowest < 1.0:
        longest = min(longest, int(log(DEAD) / log(slowest)) + 1 if slowest > 0.0 else 1)
    left = max(0, longest - close)
    spacing = max(1, -(-left // (count - close)))
    return Frames(close, spacing, left // spacing)


def outputs_alone(space: StateSpace, outputs: Sequence[int], frames: Frames) -> Doubled:
    """C A^k of some outputs, frame under frame: close frames, then spaced ones; (rows, states)."""
    C = doubled(space.C[list(outputs)])
    raised = squares(doubled(space.A), max(frames.close, frames.spacing).bit_length())
    close = krylov(C, raised, frames.close)
    if not frames.spaced:
        return close
    apart = squares(power(raised, frames.spacing), (frames.spaced - 1).bit_length())
    return close.over(krylov(C @ power(raised, frames.close), apart, frames.spaced))


def past_input(diagram: Diagram) -> dict[int, tuple[int, int]]:
    """The states that hold past input, by their number: (input, frames ago)."""
    found: dict[int, tuple[int, int]] = {}
    first = 0
    for node in diagram.nodes:
        if isinstance(node, Delay | Taps) and node.stores:
            origin = _from_input(diagram, node.source)
            if origin is not None:
                found |= {first + k: (origin[0], origin[1] + k + 1) for k in range(node.stores)}
        first += node.stores
    return found


def residue_states(diagram: Diagram) -> set[int]:
    """The states that hold past residues: they start at 0."""
    found: set[int] = set()
    first = 0
    for node in diagram.nodes:
        source = diagram.nodes[node.reads[0]] if isinstance(node, Delay) else None
        while isinstance(source, Delay):
            source = diagram.nodes[source.source]
        if isinstance(source, Residue):
            found |= set(range(first, first + node.stores))
        first += node.stores
    return found


def _from_input(diagram: Diagram, index: int) -> tuple[int, int] | None:
    """The input that a value is, and how many frames late; None where it is something else."""
    late = 0
    while True:
        match diagram.nodes[index]:
            case Input():
                return diagram.inputs.index(index), late
            case Round(source=source):
                index = source
            case Delay(source=source, n=n):
                index, late = source, late + n
            case _:
                return None


def _power_of_two(values: FloatArray) -> FloatArray:
    """The next one to each value; 1 for 0."""
    return np.exp2(np.round(np.log2(np.where(values > 0.0, values, 1.0))))
