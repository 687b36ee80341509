"""The words of an equation, each with its position; one pass from left to right."""

import re
from collections.abc import Iterator
from dataclasses import dataclass
from fractions import Fraction

from streamhost.filters.equation.refusal import quoted, refused

MOST_DIGITS = 1000
MOST_EXPONENT = 1000
WRITTEN_OTHERWISE = {"\N{MINUS SIGN}": "-", "\N{MULTIPLICATION SIGN}": "*", "\N{MIDDLE DOT}": "*", "\N{DOT OPERATOR}": "*"}
"""What text copied out of a document has in the place of our signs."""

_WORD = re.compile(
    r"(?P<blank>\s+|\#[^\n]*)"
    r"|(?P<number>(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?)"
    r"|(?P<name>[^\W\d]\w*)"
    r"|(?P<sign>[-+*/=()\[\]" + "".join(WRITTEN_OTHERWISE) + "])"
)


@dataclass(frozen=True)
class Token:
    """`kind` is "number", "name", "end", or the sign itself; `position` counts characters from 0."""

    kind: str
    text: str
    position: int


def tokens(text: str) -> Iterator[Token]:
    """Every word, and behind the last one the end. FilterError on a character that an equation does not have."""
    position = end = 0
    while position < len(text):
        match = _WORD.match(text, position)
        if match is None:
            raise refused(
                text, position, f"{quoted(text[position])} is no part of an equation, which is made of numbers, x[n-k], "
                "y[n-k], + - * / ( ) and one =."
            )
        position = match.end()
        if match.lastgroup != "blank":
            end = position
            yield _token(str(match.lastgroup), match[0], match.start())
    yield Token("end", "", end)


def number(text: str, token: Token) -> Fraction:
    """The exact value of a number as written; FilterError where it is longer than anyone writes."""
    mantissa, _, exponent = token.text.lower().partition("e")
    if len(mantissa) > MOST_DIGITS or len(exponent) > MOST_DIGITS or abs(int(exponent or 0)) > MOST_EXPONENT:
        raise refused(
            text, token.position, f"this number is too long: at most {MOST_DIGITS} digits and an exponent of at most "
            f"{MOST_EXPONENT} are read."
        )
    return Fraction(token.text)


def _token(group: str, word: str, position: int) -> Token:
    word = WRITTEN_OTHERWISE.get(word, word)
    return Token(word if group == "sign" else group, word, position)
