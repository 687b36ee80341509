"""How the gain of a cascade is spread over its sections.

Numerators are first made monic: their first coefficient that is not 0 becomes 1. K is the product of what was taken
out, S the number of sections.

`none` gives every numerator |K|^(1/S), and the sign to the first.

`l2` makes the L2 norm from the filter's input to a point of each section 1 (Jackson, 1970; Oppenheim & Schafer,
Discrete-Time Signal Processing, ch. 6). N_k is that norm while nothing is scaled, rounded to 24 significant bits.
In forms that begin with the numerator the point is the section's output: numerator k times N_(k-1) / N_k with N_0 = 1,
the last K N_(S-1), whose output stays the filter's own. In forms that begin with the recursion the point is the
recursive node: one gain 1 / N_1 in front, numerator k times N_k / N_(k+1), the last K N_S.
"""

from collections.abc import Sequence
from fractions import Fraction
from itertools import accumulate
from math import copysign

from streamhost.errors import StructureError
from streamhost.filters import Polynomials
from streamhost.filters.exact import ONE, exactly, product, rounded
from streamhost.filters.stability import is_stable
from streamhost.structures.division import Sections
from streamhost.structures.form import Half
from streamhost.structures.norm import l2_norm

Scaled = tuple[Sections, float | None]


def rescaled(sections: Sections, scaling: str | None, begins_with: Half) -> Scaled:
    """Given sections, scaled, and the gain in front. `none` leaves them, and so does a scaling without a point."""
    if scaling != "l2" or (len(sections) == 1 and begins_with == "numerator"):
        return sections, None
    return by_norms(*taken_out(sections), begins_with)


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


def by_norms(monic: Sections, gain: float, begins_with: Half) -> Scaled:
    """Scaling `l2`: the scaled sections and the gain in front, if the form wants one.

    StructureError where a norm is infinite.
    """
    norms = _norms(monic, begins_with)
    factors = [before / here for before, here in zip([1.0, *norms], norms, strict=False)]
    last = gain * (norms[-1] if norms else 1.0)
    if begins_with == "numerator":
        return _times(monic, [*factors, last]), None
    return _times(monic, [*factors[1:], last]), factors[0]


def _norms(monic: Sections, begins_with: Half) -> list[float]:
    """N_1, N_2, ...: from the input of the unscaled cascade to each scaled point. The last output is none."""
    numerators = list(accumulate((exactly(section.b) for section in monic), product, initial=ONE))
    denominators = list(accumulate((exactly(section.a) for section in monic), product, initial=ONE))
    if begins_with == "numerator":
        points = list(zip(numerators, denominators, strict=True))[1:-1]
    else:
        points = list(zip(numerators[:-1], denominators[1:], strict=True))
    _check_stable(monic[: len(points)], of=len(monic))
    return [l2_norm(numerator, denominator) for numerator, denominator in points]


def _check_stable(sections: Sections, of: int) -> None:
    for number, section in enumerate(sections, 1):
        if not is_stable(exactly(section.a)):
            raise StructureError(
                f'scaling "l2" needs the power behind section {number} of {of}, which has a pole on or outside the '
                'unit circle: it has no limit. Allowed for this filter is scaling "none".'
            )


def _times(sections: Sections, factors: Sequence[float]) -> Sections:
    return tuple(
        Polynomials(tuple(factor * value for value in section.b), section.a)
        for section, factor in zip(sections, factors, strict=True)
    )
