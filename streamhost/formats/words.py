"""Words, roundings, overflows: what a single quantization is.

Fixed point is two's complement. `Qm.n` has m integer bits with the sign and n fraction bits, m + n in all: Q1.15
is 16 bits and runs from -1 to 1 - 2^-15. The value of a code c is c / 2^n.
"""

import re
from dataclasses import dataclass, replace

from streamhost.errors import FormatError

ROUNDINGS = ("half-up", "half-even", "half-away", "floor", "toward-zero")
OVERFLOWS = ("saturate", "wrap")
MAX_WORD_BITS = 64

_Q = re.compile(r"Q(-?\d{1,3})\.(\d{1,3})")


@dataclass(frozen=True, order=True)
class Word:
    """A two's complement word of `integer` bits (sign included) and `fraction` bits."""

    integer: int
    fraction: int

    @property
    def bits(self) -> int:
        return self.integer + self.fraction

    @property
    def low(self) -> int:
        """Smallest code."""
        return -(1 << (self.bits - 1))

    @property
    def high(self) -> int:
        """Largest code."""
        return (1 << (self.bits - 1)) - 1

    def __str__(self) -> str:
        return f"Q{self.integer}.{self.fraction}"

    def widened(self, bits: int) -> "Word":
        """The same fraction with `bits` more integer bits."""
        return Word(self.integer + bits, self.fraction)

    def holds(self, other: "Word") -> bool:
        """Whether every value of `other` is a value of this word."""
        return other.fraction <= self.fraction and other.integer <= self.integer


def parse_word(text: object, place: str = "word", *, least_integer: int = 1) -> Word:
    """A word from its name, for instance "Q1.15".

    Raises FormatError that names the place, the text and what is allowed.
    """
    match = _Q.fullmatch(text) if isinstance(text, str) else None
    if match is None:
        raise FormatError(
            f'{place} = {text!r} is no word. A word is written "Qm.n", m integer bits with the sign and '
            f'n fraction bits, for instance "Q1.15".'
        )
    word = Word(int(match[1]), int(match[2]))
    if word.integer < least_integer:
        raise FormatError(
            f'{place} = "{word}" has no sign bit: m is at least {least_integer}, for instance "Q1.{word.fraction}".'
        )
    if not 2 <= word.bits <= MAX_WORD_BITS:
        raise FormatError(f'{place} = "{word}" has {word.bits} bits. A word here has from 2 to {MAX_WORD_BITS} bits.')
    return word


@dataclass(frozen=True)
class Quantizer:
    """A word, how what does not fit its fraction is rounded, and what happens when it does not fit its range."""

    word: Word
    rounding: str = "half-up"
    overflow: str = "saturate"
    dither: bool = False

    def __str__(self) -> str:
        return f"{self.word} {self.rounding}{' tpdf' if self.dither else ''} {self.overflow}"

    def with_word(self, word: Word) -> "Quantizer":
        return replace(self, word=word)
