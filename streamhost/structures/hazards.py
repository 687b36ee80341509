"""What is certain to be dangerous about a structure before any format is chosen, said in one sentence each."""

from fractions import Fraction

from streamhost.filters import Filter, Polynomials, ZerosPoles
from streamhost.filters.exact import exactly, stripped
from streamhost.filters.stability import is_stable
from streamhost.structures.division import Sections

HIGH_ORDER = 4
NEAR = Fraction(1, 100)


def hazards_of(filter: Filter, sections: Sections) -> tuple[str, ...]:
    """Sentences for the user; none where nothing is certain."""
    found = [sentence for sentence in (_sensitive(filter, sections), _unstable(filter, sections)) if sentence]
    return tuple(found)


def _sensitive(filter: Filter, sections: Sections) -> str:
    highest = max(len(section.a) - 1 for section in sections)
    if highest <= HIGH_ORDER or not any(_has_poles_near_circle(factor) for factor in filter.factors):
        return ""
    return (
        f"a recursion of order {highest} is drawn undivided, and it has poles within {float(NEAR)} of the unit circle: "
        "the smallest rounding of its coefficients moves them far. A cascade does not."
    )


def _has_poles_near_circle(factor: Polynomials | ZerosPoles) -> bool:
    inner = 1 - NEAR
    if isinstance(factor, ZerosPoles):
        return any(Fraction(p.real) ** 2 + Fraction(p.imag) ** 2 >= inner * inner for p in factor.poles)
    # A(r z^-1) has the poles of A divided by r: those beyond the radius r are then outside the unit circle.
    stretched = [value / inner**k for k, value in enumerate(stripped(exactly(factor.a)))]
    return not is_stable(tuple(stretched))


def _unstable(filter: Filter, sections: Sections) -> str:
    if all(is_stable(exactly(section.a)) for section in sections) or filter.unstable_poles():
        return ""
    return (
        "the filter is stable, and with its coefficients rounded to float64 in this decomposition it is not: "
        "a pole lies on or outside the unit circle."
    )
