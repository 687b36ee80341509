"""What comes from outside, checked and made exact: numbers, lists, tables, roots, codes, rates."""

import re
from collections.abc import Iterable
from fractions import Fraction
from math import isfinite
from numbers import Complex, Integral, Rational, Real

from streamhost.errors import FilterError

LONGEST_WORD = 64


def number(value: object, what: str) -> Fraction:
    """The exact value; FilterError unless it is a finite real number. True and False are none."""
    if not isinstance(value, Real) or isinstance(value, bool):
        raise FilterError(f"{what} is {value!r}, which is not a real number.")
    exact = Fraction(value) if isinstance(value, Rational) else _of_float(float(value), what)
    try:
        float(exact)
    except OverflowError:
        raise FilterError(f"{what} is larger than float64 holds (about 1.8e308).") from None
    return exact


def numbers(values: object, what: str) -> list[Fraction]:
    """A list of at least one number."""
    exact = [number(value, f"{what}[{i}]") for i, value in enumerate(_entries(values, what))]
    if not exact:
        raise FilterError(f"{what} is empty; at least one number is needed.")
    return exact


def rate(value: object) -> float:
    """A sample rate in hertz."""
    exact = number(value, "rate")
    if exact <= 0:
        raise FilterError(f"rate is {value!r}; a sample rate is a number of hertz above 0.")
    return float(exact)


def sections(values: object) -> list[list[Fraction]]:
    """Rows of six numbers b0 b1 b2 a0 a1 a2, at least one row."""
    rows = [numbers(row, f"sections[{i}]") for i, row in enumerate(_entries(values, "sections"))]
    if not rows:
        raise FilterError("sections is empty; at least one row b0 b1 b2 a0 a1 a2 is needed.")
    for i, row in enumerate(rows):
        if len(row) != 6:
            raise FilterError(f"sections[{i}] has {len(row)} numbers; a section is six: b0 b1 b2 a0 a1 a2.")
    return rows


def roots(values: object, what: str) -> tuple[complex, ...]:
    """Zeros or poles: conjugate pairs first, upper half plane first, then the real ones; roots at 0 included.

    FilterError unless each complex root comes with its exact conjugate: a filter with real coefficients has no
    others.
    """
    given = [_root(value, f"{what}[{i}]") for i, value in enumerate(_entries(values, what))]
    unpaired = [root for root in given if root.imag < 0]
    pairs: list[complex] = []
    for i, root in enumerate(given):
        if root.imag > 0:
            if root.conjugate() not in unpaired:
                raise _without_partner(what, i, root)
            unpaired.remove(root.conjugate())
            pairs += [root, root.conjugate()]
    if unpaired:
        raise _without_partner(what, given.index(unpaired[0]), unpaired[0])
    return tuple(pairs + [complex(root.real, 0.0) for root in given if root.imag == 0])


def word(text: object) -> tuple[int, int]:
    """Integer bits (the sign among them) and fraction bits of a word such as "Q4.12"."""
    match = re.fullmatch(r"Q(-?\d{1,3})\.(\d{1,3})", text) if isinstance(text, str) else None
    if match is None:
        raise FilterError(
            f'word is {text!r}; a word is written like "Q4.12": integer bits with the sign, then fraction bits.'
        )
    integer, fraction = int(match[1]), int(match[2])
    if not 2 <= integer + fraction <= LONGEST_WORD:
        raise FilterError(f'word is "{text}", which has {integer + fraction} bits; a word has 2 to {LONGEST_WORD}.')
    return integer, fraction


def codes(values: object, word_text: str) -> tuple[tuple[int, ...], ...]:
    """Rows of six codes b0 b1 b2 a0 a1 a2; where a table has five columns, a0 is put in as the code of 1."""
    integer, fraction = word(word_text)
    one, limit = 1 << fraction, 1 << (integer + fraction - 1)
    rows = [
        [_code(value, f"codes[{i}][{j}]") for j, value in enumerate(_entries(row, f"codes[{i}]"))]
        for i, row in enumerate(_entries(values, "codes"))
    ]
    if not rows:
        raise FilterError("codes is empty; at least one row b0 b1 b2 a0 a1 a2 is needed.")
    columns = len(rows[0])
    for i, row in enumerate(rows):
        if len(row) not in (5, 6) or len(row) != columns:
            raise FilterError(
                f"codes[{i}] has {len(row)} codes; every row is six, b0 b1 b2 a0 a1 a2, "
                "or every row is five with a0 left out."
            )
        for j, code in enumerate(row):
            if not (j == 3 and columns == 6):
                _check_code(code, limit, f"codes[{i}][{j}]", word_text)
        if columns == 6:
            _check_one(row[3], one, limit, f"codes[{i}][3]", word_text)
    return tuple((*row[:3], one, *row[-2:]) for row in rows)


def _check_code(code: int, limit: int, what: str, word_text: str) -> None:
    if not -limit <= code < limit:
        raise FilterError(f"{what} is {code}, which is no code of {word_text}: {-limit} to {limit - 1} are allowed.")
    if int(float(code)) != code:
        bits = (abs(code) // (code & -code)).bit_length()
        raise FilterError(
            f"{what} is {code}, which takes {bits} bits without the zeros behind; coefficients are float64, which "
            "holds 53. Give codes of a shorter word."
        )


def _check_one(code: int, one: int, limit: int, what: str, word_text: str) -> None:
    if one >= limit:
        raise FilterError(
            f"{what} is a0, which must be the code of 1, and {word_text} cannot hold 1 ({one} is above {limit - 1}): "
            "give five columns, b0 b1 b2 a1 a2, and a0 is taken as exactly 1."
        )
    if code != one:
        raise FilterError(f"{what} is a0 = {code}; in {word_text} a0 must be the code of 1, which is {one}.")


def _code(value: object, what: str) -> int:
    if not isinstance(value, Integral) or isinstance(value, bool):
        raise FilterError(f"{what} is {value!r}, which is not an integer; codes are integers.")
    return int(value)


def _root(value: object, what: str) -> complex:
    if isinstance(value, Real):
        return complex(float(number(value, what)))
    if not isinstance(value, Complex):
        raise FilterError(f"{what} is {value!r}, which is not a number.")
    root = complex(value)
    if not (isfinite(root.real) and isfinite(root.imag)):
        raise FilterError(f"{what} is {value!r}, which is not finite.")
    return root


def _without_partner(what: str, i: int, root: complex) -> FilterError:
    return FilterError(
        f"{what}[{i}] is {root!r} and its conjugate {root.conjugate()!r} is not among them as often; "
        "complex roots come in exactly conjugate pairs."
    )


def _entries(values: object, what: str) -> list[object]:
    if isinstance(values, str | bytes) or not isinstance(values, Iterable):
        raise FilterError(f"{what} is {values!r}, which is not a list.")
    try:
        return list(values)
    except TypeError:  # an array without dimensions calls itself iterable and is not
        raise FilterError(f"{what} is {values!r}, which is not a list.") from None


def _of_float(value: float, what: str) -> Fraction:
    if not isfinite(value):
        raise FilterError(f"{what} is {value!r}, which is not finite.")
    return Fraction(value)
