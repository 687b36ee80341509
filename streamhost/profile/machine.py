"""What operations cost a machine of the kind that this program runs on: a stated table, in round numbers.

Cycles until a result can be used at the earliest, and operations that can begin in a cycle, of a common 64-bit core that begins
four operations a cycle (the numbers are common practice; no core is named). Each is rather too low than too high, so that what
is made of them is a bound: a saturation costs no wait where the core guesses rightly that it will not happen.
"""

from dataclasses import dataclass
from fractions import Fraction

from streamhost.profile.operations import Operation, operations
from streamhost.program.program import Program

ISSUE = 4


@dataclass(frozen=True)
class Latencies:
    """Cycles from operand to result. `fused`: a multiplication and an addition in one operation."""

    multiply: int
    add: int
    fused: int
    shift: int
    round: int
    saturate: int

    def of(self, kind: str) -> int:
        """By the name of an operation."""
        return int(getattr(self, kind))


FLOAT = Latencies(multiply=3, add=3, fused=4, shift=3, round=4, saturate=0)
ONE_WORD = Latencies(multiply=3, add=1, fused=4, shift=1, round=2, saturate=0)
TWO_WORDS = Latencies(multiply=4, add=2, fused=6, shift=2, round=3, saturate=0)

# Machine operations that one of ours takes, of integers in one word: a rounding adds and shifts, a saturation compares and
# chooses twice. Load and store are those of the sample only: the rest stays in registers.
STEPS = {"multiply": 1, "add": 1, "shift": 1, "round": 2, "saturate": 4}
SAMPLE_STEPS = 2
TWO_WORDS_TIMES = {"multiply": 3, "add": 2, "shift": 2, "round": 2, "saturate": 2}

FLOAT_UNITS = {"multiply": 2, "add": 2, "shift": 2, "round": 1}
INTEGER_MULTIPLIERS = 1


def latencies(program: Program, index: int) -> Latencies:
    """Those of a node's value."""
    if program.types:
        return FLOAT
    return TWO_WORDS if program.numbers[index].carrier > 64 else ONE_WORD


def busy_cycles(program: Program) -> Fraction:
    """Cycles in which a frame of one channel can at best be begun: the busiest of the units, or all that is to begin."""
    done = [each for each in operations(program) if each.kind in STEPS and each.count]
    if program.types:
        units = [Fraction(_count(done, kind), most) for kind, most in FLOAT_UNITS.items()]
        return max(*units, Fraction(sum(each.count for each in done) + SAMPLE_STEPS, ISSUE))
    multiplied = _steps([each for each in done if each.kind == "multiply"])
    return max(Fraction(multiplied, INTEGER_MULTIPLIERS), Fraction(_steps(done) + SAMPLE_STEPS, ISSUE))


def _count(done: list[Operation], kind: str) -> int:
    return sum(each.count for each in done if each.kind == kind)


def _steps(done: list[Operation]) -> int:
    """Machine operations: longer than a machine word takes several. A product has the bits of both factors."""
    times = [TWO_WORDS_TIMES[each.kind] if each.bits + each.other > 64 else 1 for each in done]
    return sum(each.count * STEPS[each.kind] * many for each, many in zip(done, times, strict=True))
