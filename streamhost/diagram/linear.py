"""The state space and the transfer function that a diagram has; the functions of the package in one place."""

from dataclasses import dataclass

from streamhost.diagram.diagram import Diagram
from streamhost.diagram.rows import FloatArray, Rows, propagate
from streamhost.diagram.transfer import (
    ExactTransferFunction,
    TransferFunction,
    exact_transfer_function,
    transfer_function,
)

__all__ = [
    "ExactTransferFunction", "Rows", "StateSpace", "TransferFunction", "exact_transfer_function", "propagate",
    "state_space", "transfer_function",
]


@dataclass(frozen=True, eq=False)
class StateSpace:
    """x[n+1] = A x[n] + B u[n], y[n] = C x[n] + D u[n], of one channel.

    States are in order of nodes: a delay of n frames has n, newest first, a taps node one less than its length.
    Inputs and outputs are in order of creation.
    """

    A: FloatArray
    B: FloatArray
    C: FloatArray
    D: FloatArray


def state_space(diagram: Diagram, channel: int = 0) -> StateSpace:
    """A (states, states), B (states, inputs), C (outputs, states), D (outputs, inputs) of one channel."""
    rows = propagate(diagram, channel)
    outputs = list(diagram.outputs)
    return StateSpace(rows.A, rows.B, rows.F[outputs], rows.G[outputs])
