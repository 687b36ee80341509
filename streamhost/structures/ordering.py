"""In which order sections are drawn: by the distance of their poles from the unit circle.

`outward`: nearest the circle last; `inward`: first (Jackson, 1970; Oppenheim & Schafer, Discrete-Time Signal
Processing, ch. 6). A section without poles has them at z = 0.
"""

from fractions import Fraction

from streamhost.filters import Polynomials
from streamhost.filters.roots import roots
from streamhost.structures.division import Sections
from streamhost.structures.pairing import from_circle


def arranged(sections: Sections, ordering: str) -> Sections:
    """Trimmed sections in the order of that name; of sections equally far from the circle the first stays first."""
    if ordering == "given":
        return sections
    sign = 1 if ordering == "inward" else -1
    return tuple(sorted(sections, key=lambda section: sign * _nearest_pole(section)))


def _nearest_pole(section: Polynomials) -> Fraction:
    return min((from_circle(pole) for pole in roots(section.a)), default=Fraction(1))
