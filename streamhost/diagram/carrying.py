"""The state of one diagram that continues the output of another.

Without input a state x gives the outputs C A^k x, k = 0, 1, ... The state of the diagram that takes over is the one whose
outputs are nearest to those of the diagram before it, in the least squares over a finite horizon: until both have died,
at most two seconds, so that poles on the circle are no special case. Rows are taken one by one at first, then evenly
spaced and weighted by the root of the spacing, and made in double-double: for poles near z = 1 powers of A grow by many
digits before they die. Gramians and a Sylvester equation, the textbook's way, lose all digits there.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from math import log

import numpy as np
from numpy.typing import NDArray

from streamhost.diagram.diagram import Diagram
from streamhost.diagram.doubled import Doubled, doubled, krylov, power
from streamhost.diagram.linear import StateSpace
from streamhost.diagram.nodes import Delay, Input, Residue, Round, Taps

FloatArray = NDArray[np.float64]

CLOSE_ROWS = 512
SPACED_ROWS = 3584
LONGEST_S = 2.0
DEAD = 1e-13
"""Of its size at the start: a response is taken to have died when that much is left."""

RELATIVE_RANK = 1e-10

SOLVED_TIMES = 2
"""Once, and once for what the first left over: a state is then as good as its word, however large it is."""


@dataclass(frozen=True)
class Continuation:
    """x2 = M x1: the state that continues, from the state before; `rest` @ x1 is what the output then lacks.

    M: (states of the next, states before); rest: (rows, states before), at the frames that were looked at.
    """

    M: Doubled
    rest: FloatArray

    def state(self, before: FloatArray) -> FloatArray:
        """(states of the next, channels) from (states before, channels)."""
        return (self.M @ doubled(before)).high

    def missed(self, before: FloatArray) -> float:
        """The largest deviation of the output, over the frames looked at, from what would have come."""
        return float(np.abs(self.rest @ before).max(initial=0.0))


def continuation(before: Doubled, following: Doubled, weights: FloatArray) -> Continuation:
    """From the zero-input outputs of unit states, (rows, states) of each diagram at the same frames.

    Columns are scaled to unit norm; O2 = QR; the singular value decomposition of R, where singular values below
    1e-10 of the largest count as 0, solves for M, and what is left over is solved for again.
    """
    second, norms = _unit_columns(following.high * weights[:, np.newaxis])
    Q, R = np.linalg.qr(second)
    U, s, Vt = np.linalg.svd(R, full_matrices=False)
    rank = int(np.sum(s > RELATIVE_RANK * s[0])) if len(s) else 0
    back: FloatArray = (Vt[:rank].T / s[:rank] / norms[:, np.newaxis]) @ (Q @ U[:, :rank]).T
    M = doubled(np.zeros((following.high.shape[1], before.high.shape[1])))
    rest = before
    for _ in range(SOLVED_TIMES):
        M = M + doubled(back @ (rest.high * weights[:, np.newaxis]))
        rest = before + -(following @ M)
    return Continuation(M, rest.high)


def looked_at(spaces: Sequence[StateSpace], rate: float) -> tuple[int, int]:
    """(spacing, rows) of the frames after the close ones: until all have died, at most two seconds."""
    longest = int(LONGEST_S * rate)
    slowest = max((float(np.abs(np.linalg.eigvals(space.A)).max(initial=0.0)) for space in spaces), default=0.0)
    if slowest < 1.0:
        longest = min(longest, int(log(DEAD) / log(slowest)) + 1 if slowest > 0.0 else 1)
    left = max(0, longest - CLOSE_ROWS)
    spacing = max(1, -(-left // SPACED_ROWS))
    return spacing, left // spacing


def weights_of(spacing: int, rows: int, outputs: int) -> FloatArray:
    """The weight of each row of `outputs_alone`."""
    return np.concatenate([np.ones(CLOSE_ROWS * outputs), np.full(rows * outputs, np.sqrt(spacing))])


def outputs_alone(space: StateSpace, outputs: Sequence[int], spacing: int, rows: int) -> Doubled:
    """C A^k of some outputs, frame under frame: close frames, then spaced ones; (rows, states)."""
    A, C = doubled(space.A), doubled(space.C[list(outputs)])
    close = krylov(C, A, CLOSE_ROWS)
    spaced = krylov(C @ power(A, CLOSE_ROWS), power(A, spacing), rows)
    return close.over(spaced)


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


def _unit_columns(matrix: FloatArray) -> tuple[FloatArray, FloatArray]:
    norms = np.sqrt((matrix**2).sum(axis=0))
    norms[norms == 0.0] = 1.0
    return matrix / norms, norms
