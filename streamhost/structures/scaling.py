"""How the gain of a cascade is spread over its sections.

Numerators are first made monic: their first coefficient that is not 0 becomes 1. K is the product of what was taken
out, S the number of sections.

`none` gives every numerator |K|^(1/S), and the sign to the first.

`l2` makes the L2 norm from the filter's input to a point of each section 1, `l1` the L1 norm, `linf` the peak of the
frequency response (Jackson, 1970; Oppenheim & Schafer, Discrete-Time Signal Processing, ch. 6): with L1 no input can
overflow the point, with the peak no sine can, with L2 white noise is as loud there as at the input. N_k is that norm
while nothing is scaled, rounded to 24 significant bits.
In forms that begin with the numerator the point is the section's output: numerator k times N_(k-1) / N_k with N_0 = 1,
the last K N_(S-1), whose output stays the filter's own. In forms that begin with the recursion the point is the
recursive node: one gain 1 / N_1 in front, numerator k times N_k / N_(k+1), the last K N_S.

`l1-shift`, `l2-shift`, `linf-shift` leave the sections of `none` as they are and put a power of two before each, the
one that brings the norm of its point nearest to 1; what is left of it is undone behind the last point. No coefficient
and no multiplication comes from it.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from itertools import accumulate, pairwise
from math import copysign, log2

from streamhost.errors import StructureError
from streamhost.filters import Polynomials
from streamhost.filters.exact import ONE, exactly, product, rounded
from streamhost.filters.stability import is_stable
from streamhost.structures.division import Sections
from streamhost.structures.form import Half
from streamhost.structures.norm import l2_norm
from streamhost.structures.points import norms_of_points

SHIFT = "-shift"

@dataclass(frozen=True)
class Scaled:
    """Sections, the gain in front of them (None: none), and the powers of two before each and behind the last."""

    sections: Sections
    front: float | None = None
    shifts: tuple[int, ...] = ()


def rescaled(sections: Sections, scaling: str, begins_with: Half) -> Scaled:
    """Given sections, scaled. `none` leaves them, and so does a scaling without a point."""
    if scaling == "none" or (len(sections) == 1 and begins_with == "numerator"):
        return Scaled(sections)
    if scaling.endswith(SHIFT):
        return by_shifts(sections, scaling, begins_with)
    return by_norms(*taken_out(sections), scaling, begins_with)


def has_norms(scaling: str) -> bool:
    """Whether a scaling changes the numerators by norms."""
    return scaling != "none" and not scaling.endswith(SHIFT)


def taken_out(sections: Sections) -> tuple[Sections, float]:
    """The sections with monic numerators, and K. A numerator of zeros becomes 1, and K is 0."""
    gain = Fraction(1)
    monic = []
    for section in sections:
        first = next((i for i, value in enumerate(section.b) if value != 0), None)
        if first is None:
            monic.append(Polynomials((1.0,), section.a))
            gain = Fraction(0)
        else:
            monic.append(Polynomials(tuple(value / section.b[first] for value in section.b), section.a))
            gain *= Fraction(section.b[first])
    return tuple(monic), rounded((gain,))[0]


def spread(monic: Sections, gain: float) -> Sections:
    """Scaling `none`."""
    share: float = abs(gain) ** (1 / len(monic))
    return _times(monic, [copysign(share, gain), *[share] * (len(monic) - 1)])


def by_norms(monic: Sections, gain: float, scaling: str, begins_with: Half) -> Scaled:
    """Scaling `l1`, `l2` or `linf`. StructureError where a norm is infinite."""
    norms = _norms(monic, scaling, begins_with)
    factors = [before / here for before, here in zip([1.0, *norms], norms, strict=False)]
    last = gain * (norms[-1] if norms else 1.0)
    if begins_with == "numerator":
        return Scaled(_times(monic, [*factors, last]))
    return Scaled(_times(monic, [*factors[1:], last]), factors[0])


def by_shifts(sections: Sections, scaling: str, begins_with: Half) -> Scaled:
    """Sections as they are, and the powers of two of scaling `l1-shift`, `l2-shift` or `linf-shift`."""
    norms = _norms(sections, scaling.removesuffix(SHIFT), begins_with)
    levels = [0, *(-round(log2(norm)) for norm in norms), 0]
    shifts = [here - before for before, here in pairwise(levels)]
    return Scaled(sections, None, tuple([*shifts, 0] if begins_with == "numerator" else shifts))


def _norms(sections: Sections, norm: str, begins_with: Half) -> list[float]:
    """N_1, N_2, ...: from the input of the unscaled cascade to each scaled point. The last output is none."""
    points = len(sections) - 1 if begins_with == "numerator" else len(sections)
    _check_stable(sections[:points], of=len(sections), scaling=norm)
    if norm != "l2":
        return norms_of_points(sections[:points], norm, begins_with)
    numerators = list(accumulate((exactly(section.b) for section in sections), product, initial=ONE))
    denominators = list(accumulate((exactly(section.a) for section in sections), product, initial=ONE))
    before = numerators[1:] if begins_with == "numerator" else numerators
    return [l2_norm(b, a) for b, a in zip(before[:points], denominators[1:], strict=False)]


def _check_stable(sections: Sections, of: int, scaling: str) -> None:
    for number, section in enumerate(sections, 1):
        if not is_stable(exactly(section.a)):
            raise StructureError(
                f'scaling "{scaling}" needs the size of the signal behind section {number} of {of}, which has a pole on '
                'or outside the unit circle: it has no limit. Allowed for this filter is scaling "none".'
            )


def _times(sections: Sections, factors: Sequence[float]) -> Sections:
    return tuple(
        Polynomials(tuple(factor * value for value in section.b), section.a)
        for section, factor in zip(sections, factors, strict=True)
    )
