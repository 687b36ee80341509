"""What a program may ask of a machine: no value on the way longer than two 64-bit words, none that is kept than one.

A value on the way is a product, a term brought to its accumulator's fraction, the exact sum of the terms (in a stated
accumulator too, since its overflow is counted against it), a sum with its dither, a code at its register's fraction.
"""

from streamhost.errors import FormatError
from streamhost.formats import Word
from streamhost.formats.words import MAX_WORD_BITS

MOST_BITS = 2 * MAX_WORD_BITS


def carrier_bits(bound: int) -> int:
    """Bits of the machine integer that holds a value of that magnitude, either sign: 64, or two such words."""
    return MAX_WORD_BITS if bound < 1 << MAX_WORD_BITS - 1 else MOST_BITS


def carried(bound: int, what: str, remedy: str) -> int:
    """The largest magnitude of a value; FormatError where 128 bits do not hold it. `remedy` may name the {excess}."""
    if bound < 1 << MOST_BITS - 1:
        return bound
    bits = bound.bit_length() + 1
    excess = f"{bits - MOST_BITS} bit{'s' if bits - MOST_BITS > 1 else ''}"
    raise FormatError(
        f"{what} may need {bits} bits, {excess} more than the {MOST_BITS} that are carried. "
        + remedy.format(excess=excess)
    )


def kept(word: Word, what: str, remedy: str) -> Word:
    """The word of a register; FormatError where it is longer than 64 bits."""
    if word.bits > MAX_WORD_BITS:
        raise FormatError(
            f"{what} would stand in {word}, which has {word.bits} bits, and a register has at most {MAX_WORD_BITS}. "
            f"{remedy}"
        )
    return word
