"""The dead-band formulas of the textbooks: estimates of how large a limit cycle becomes, never guarantees.

L. Jackson, "An analysis of limit cycles due to multiplication rounding in recursive digital filters", Allerton 1969;
Oppenheim & Schafer, ch. 6. They hold an effective pole on the circle: for one rounding to the nearest in a direct form
they are near the truth, other roundings and forms have none or larger ones, and even there cycles exceed them.
"""

from dataclasses import dataclass
from fractions import Fraction
from math import acos, floor, pi

from streamhost.diagram.rows import propagate
from streamhost.program.program import Program


@dataclass(frozen=True)
class DeadBand:
    """How large, in steps of the register, and how long, in frames; None where the formula has no answer."""

    lsb: int | None
    period_frames: float | None


def dead_band(a1: Fraction, a2: Fraction | None = None) -> DeadBand:
    """Of y[n] = -a1 y[n-1], or -a1 y[n-1] - a2 y[n-2]: floor(0.5 / (1 - |a|)) of the last coefficient.

    The period is that of a pole pair on the circle, 2 pi / arccos(-a1 / 2); of one pole 1, or 2 where it is negative.
    """
    last = a1 if a2 is None else a2
    if abs(last) >= 1:
        return DeadBand(None, None)
    lsb = floor(Fraction(1, 2) / (1 - abs(last)))
    if a2 is None:
        return DeadBand(lsb, 2.0 if a1 > 0 else 1.0)
    inside = a2 > 0 and -2 < a1 < 2
    return DeadBand(lsb, 2.0 * pi / acos(-float(a1) / 2.0) if inside else None)


def dead_band_of(program: Program, channel: int = 0) -> DeadBand:
    """Of a part with one or two states, from the polynomial of its state matrix; no answer for others."""
    rows = [[Fraction(float(value)) for value in row] for row in propagate(program.diagram, channel).A]
    if len(rows) == 1:
        return dead_band(-rows[0][0])
    if len(rows) == 2:
        return dead_band(-rows[0][0] - rows[1][1], rows[0][0] * rows[1][1] - rows[0][1] * rows[1][0])
    return DeadBand(None, None)
