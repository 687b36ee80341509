"""Poles of a program that lie on or outside the unit circle, decided exactly, and those of them that do no harm."""

from collections.abc import Sequence
from dataclasses import dataclass

from streamhost.diagram.diagram import Diagram
from streamhost.diagram.graph import loops
from streamhost.diagram.loop_matrices import loop_matrices, memories_of_loops
from streamhost.diagram.nodes import Delay, Round, Sum
from streamhost.diagram.polynomials import determinant
from streamhost.diagram.transfer import QUICK_WORK, exact_transfer_function
from streamhost.errors import DiagramError
from streamhost.filters import Polynomials
from streamhost.filters.exact import Polynomial, stripped
from streamhost.filters.stability import roots_on_and_outside, unstable_poles
from streamhost.formats import Float
from streamhost.program.program import Program, RoundArithmetic, SumArithmetic

FLOATS, DROPS, SATURATES, WRAPS = "floats", "drops", "saturates", "wraps"
"""What a loop loses: rounded sums, bits dropped, what saturates, or nothing, since it wraps."""


@dataclass(frozen=True)
class Cancelled:
    """How many poles on the circle zeros cancel, whether the response is then finite, and the most that the loops lose."""

    poles: int
    finite: bool
    lost: str


def unstable_poles_in(diagram: Diagram) -> int:
    """Of the channel that has most; a pole that zeros cancel is counted like any other."""
    return max(_in_channel(diagram, channel) for channel in range(diagram.channels))


def on_and_outside(diagram: Diagram) -> tuple[int, int]:
    """Poles on the unit circle, decided exactly, and outside it, of the channel that has most outside."""
    channels = [_sum_of_pairs(denominators(diagram, channel)) for channel in range(diagram.channels)]
    return max(channels, key=lambda pair: (pair[1], pair[0]))


def denominators(diagram: Diagram, channel: int = 0) -> list[Polynomial]:
    """The denominator of each loop, exact, in ascending powers of z^-1; what no loop contains has its poles at 0."""
    return [stripped(determinant(matrix)) for matrix in loop_matrices(diagram, channel)]


def cancelled_on_circle(program: Program) -> Cancelled | None:
    """Of the first channel; None where there are none but those of marked running sums, where nothing is heard, or where
    telling takes long."""
    diagram = program.diagram
    at_risk = [(memories, on) for memories, denominator in zip(memories_of_loops(diagram), denominators(diagram), strict=True)
               if (on := roots_on_and_outside(denominator)[0])]
    owners = {index: loop for loop in loops(diagram.readers) for index in loop}
    unmarked = [(owners[memories[0]], on) for memories, on in at_risk if not _is_running_sum(program, owners[memories[0]])]
    if not unmarked:
        return None
    try:
        transfer = exact_transfer_function(diagram, most_work=QUICK_WORK)
    except DiagramError:
        return None
    lowest = stripped(transfer.denominator)
    poles = sum(on for _, on in unmarked) - roots_on_and_outside(lowest)[0]
    if poles <= 0 or not any(numerator for row in transfer.numerators for numerator in row):
        return None
    lost = {_lost(program, loop) for loop, _ in unmarked}
    return Cancelled(poles, len(lowest) == 1, next(kind for kind in (FLOATS, DROPS, SATURATES, WRAPS) if kind in lost))


def _lost(program: Program, loop: Sequence[int]) -> str:
    if isinstance(program.format, Float):
        return FLOATS
    overflows = []
    for index in loop:
        arithmetic = program.arithmetic[index]
        if isinstance(arithmetic, RoundArithmetic):
            overflows.append(arithmetic.quantizer.overflow)
            if arithmetic.drop > 0:
                return DROPS
        if isinstance(arithmetic, SumArithmetic) and arithmetic.accumulator.word is not None:
            overflows.append(arithmetic.accumulator.overflow)
    return WRAPS if set(overflows) <= {"wrap"} else SATURATES


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


def _sum_of_pairs(polynomials: Sequence[Polynomial]) -> tuple[int, int]:
    pairs = [roots_on_and_outside(each) for each in polynomials]
    return sum(on for on, _ in pairs), sum(outside for _, outside in pairs)


def _on_or_outside(denominator: Polynomial) -> int:
    return unstable_poles(Polynomials((1.0,), denominator))  # type: ignore[arg-type]
