"""Poles of a program that lie on or outside the unit circle, decided exactly, and those of them that do no harm."""

from collections.abc import Sequence

from streamhost.diagram.diagram import Diagram
from streamhost.diagram.graph import loops
from streamhost.diagram.loop_matrices import loop_matrices
from streamhost.diagram.nodes import Delay, Round, Sum
from streamhost.diagram.polynomials import determinant
from streamhost.filters import Polynomials
from streamhost.filters.exact import Polynomial, stripped
from streamhost.filters.stability import unstable_poles
from streamhost.program.program import Program, RoundArithmetic


def unstable_poles_in(diagram: Diagram) -> int:
    """Of the channel that has most; a pole that zeros cancel is counted like any other."""
    return max(_in_channel(diagram, channel) for channel in range(diagram.channels))


def denominators(diagram: Diagram, channel: int = 0) -> list[Polynomial]:
    """The denominator of each loop, exact, in ascending powers of z^-1; what no loop contains has its poles at 0."""
    return [stripped(determinant(matrix)) for matrix in loop_matrices(diagram, channel)]


def running_sums(program: Program) -> tuple[int, int]:
    """Loops of one marked sum and a delay: those in which nothing is ever lost, since they wrap and drop no bit, and others.

    The pole of the former at z = 1 is cancelled exactly; in the latter what is lost once stays.
    """
    found = [loop for loop in loops(program.diagram.readers) if _is_running_sum(program, loop)]
    exact = sum(all(_drops_nothing(program, index) for index in loop) for loop in found)
    return exact, len(found) - exact


def _is_running_sum(program: Program, loop: Sequence[int]) -> bool:
    nodes = [program.nodes[index] for index in loop]
    marked = any(isinstance(node, Sum) and node.grow is not None for node in nodes)
    return marked and all(isinstance(node, Sum | Delay | Round) for node in nodes)


def _drops_nothing(program: Program, index: int) -> bool:
    """Floats round every sum."""
    if not isinstance(program.nodes[index], Round):
        return bool(program.arithmetic)
    arithmetic = program.arithmetic[index]
    return isinstance(arithmetic, RoundArithmetic) and arithmetic.drop <= 0


def _in_channel(diagram: Diagram, channel: int) -> int:
    return sum(map(_on_or_outside, denominators(diagram, channel)))


def _on_or_outside(denominator: Polynomial) -> int:
    return unstable_poles(Polynomials((1.0,), denominator))  # type: ignore[arg-type]
