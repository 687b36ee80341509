"""From sections whose numbers, scale and sign are decided to a filter."""

from fractions import Fraction

from streamhost.filters import Filter
from streamhost.presets.importing import codes
from streamhost.presets.importing.stated import Number, Section, Sections, refused

LONGEST_ROW = (3, 2)
"""Coefficients in b and in a1, a2 of a row."""

VANISHING = Fraction(1, 1 << 1075)
"""Half of the smallest float64 above 0; what is no larger is rounded to 0."""


def built(sections: Sections, word: str | None, *, added: bool, rate: float) -> Filter:
    """The filter; `added`: the feedback coefficients have the sign that a difference equation adds them with.

    Codes stay codes where `keeps_codes` says so. Raises RequestError where a coefficient divided by a0 leaves float64.
    """
    if word is not None and keeps_codes(sections, word, added=added):
        return Filter.from_codes([_row_of_codes(section, added) for section in sections], word, rate=rate)
    if all((len(section.b), len(section.feedback)) == LONGEST_ROW for section in sections):
        rows = [[*b, *a] for b, a in (_polynomials(section, word, added) for section in sections)]
        return Filter.from_sections(rows, rate=rate)
    parts = [Filter.from_coefficients(*_polynomials(section, word, added), rate=rate) for section in sections]
    return Filter.cascade(parts) if len(parts) > 1 else parts[0]


def keeps_codes(sections: Sections, word: str, *, added: bool) -> bool:
    """Whether a preset can hold the codes: rows of sections only, and -a1, -a2 must be codes too."""
    return all(
        len(section.b) <= LONGEST_ROW[0] and len(section.feedback) <= LONGEST_ROW[1]
        and all(codes.fits(-int(number.value) if added else int(number.value), word) for number in section.feedback)
        for section in sections
    )


def checked_a0(sections: Sections) -> None:
    """RequestError for an a0 of 0."""
    for section in sections:
        if section.a0 and section.a0.value == 0:
            raise refused(section.a0.place, "a0 is 0, and everything is divided by it.")


def _row_of_codes(section: Section, added: bool) -> list[int]:
    b = [int(number.value) for number in section.b]
    feedback = [-int(number.value) if added else int(number.value) for number in section.feedback]
    return b + [0] * (LONGEST_ROW[0] - len(b)) + feedback + [0] * (LONGEST_ROW[1] - len(feedback))


def _polynomials(section: Section, word: str | None, added: bool) -> tuple[list[Fraction], list[Fraction]]:
    """(b, a) with a0 divided out exactly."""
    a0 = codes.value(section.a0, word) if section.a0 else Fraction(1)
    b = [_quotient(number, a0, word) for number in section.b]
    feedback = [_quotient(number, a0, word) for number in section.feedback]
    return b, [Fraction(1), *([-value for value in feedback] if added else feedback)]


def _quotient(number: Number, a0: Fraction, word: str | None) -> Fraction:
    quotient = codes.value(number, word) / a0
    if quotient and abs(quotient) <= VANISHING:
        raise refused(number.place, f"{number.value} divided by a0 is smaller than float64 holds (about 4.9e-324), and not 0.")
    return quotient
