"""Poles of a program that lie on or outside the unit circle, decided exactly."""

from collections.abc import Sequence

from streamhost.diagram.diagram import Diagram
from streamhost.diagram.graph import loops
from streamhost.diagram.loop_matrices import loop_matrices
from streamhost.diagram.nodes import Delay, Round, Sum
from streamhost.diagram.polynomials import determinant
from streamhost.filters import Polynomials
from streamhost.filters.stability import unstable_poles
from streamhost.program.program import Program, RoundArithmetic


def unstable_poles_in(diagram: Diagram) -> int:
    """Of the channel that has most; what zeros cancel is counted too."""
    return max(_in_channel(diagram, channel) for channel in range(diagram.channels))


def exact_running_sums(program: Program) -> int:
    """Loops of one marked sum that wraps and drops no bit: nothing is lost in them, so that their pole does no harm."""
    return sum(all(_is_exact(program, index) for index in loop) for loop in loops(program.diagram.readers))


def _is_exact(program: Program, index: int) -> bool:
    node, arithmetic = program.nodes[index], program.arithmetic[index] if program.arithmetic else None
    if isinstance(node, Round):
        return isinstance(arithmetic, RoundArithmetic) and arithmetic.drop <= 0 and arithmetic.quantizer.overflow == "wrap"
    return isinstance(node, Delay) or (isinstance(node, Sum) and node.grow is not None and arithmetic is not None)


def _in_channel(diagram: Diagram, channel: int) -> int:
    return sum(_on_or_outside(determinant(matrix)) for matrix in loop_matrices(diagram, channel))


def _on_or_outside(denominator: Sequence[object]) -> int:
    return unstable_poles(Polynomials((1.0,), tuple(denominator)))  # type: ignore[arg-type]
