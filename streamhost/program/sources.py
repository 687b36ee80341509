"""Where a program rounds: every source of noise, with the bits that it really drops."""

from dataclasses import dataclass

from streamhost.program.program import Program, RoundArithmetic


def traced_roundings(program: Program) -> tuple[int, ...]:
    """Registers that drop bits, in evaluation order: those whose residues a traced kernel writes down."""
    found = []
    for index in program.roundings:
        arithmetic = program.arithmetic[index] if program.arithmetic else None
        if isinstance(arithmetic, RoundArithmetic) and arithmetic.drop > 0:
            found.append(index)
    return tuple(found)


@dataclass(frozen=True)
class Source:
    """One source of rounding noise: an error added at `node`, its variance and mean in units of the signal squared."""

    node: int
    variance: float
    mean: float
