"""One number as text: decimal or hexadecimal, integer or not."""

import re
import struct
from fractions import Fraction

from streamhost.presets.importing.stated import Number, refused
from streamhost.presets.mistakes import one_line

MOST_CHARACTERS = 400

_DECIMAL_INTEGER = re.compile(r"[+-]?[0-9]+")
_HEXADECIMAL_INTEGER = re.compile(r"[+-]?0[xX][0-9a-fA-F]+")
_DECIMAL = re.compile(r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?")
_HEXADECIMAL = re.compile(r"[+-]?0[xX](?:[0-9a-fA-F]+\.?[0-9a-fA-F]*|\.[0-9a-fA-F]+)[pP][+-]?[0-9]+")
_INFINITE_SINGLE = 0x7F80_0000


def literal(text: str, place: str) -> Number:
    """The number that the text is, as an int or rounded once to float64; RequestError where it is none."""
    if len(text) > MOST_CHARACTERS:
        raise refused(place, f"this number has {len(text)} characters; at most {MOST_CHARACTERS} are read.")
    try:
        value = _value(text)
        float(value)
    except OverflowError:
        raise refused(place, f"{one_line(text)} is larger than float64 holds (about 1.8e308).") from None
    except ValueError:
        raise refused(place, f'"{one_line(text)}" is no number. Decimals have a point: 0.5.') from None
    if value == 0 and not _is_zero(text):
        raise refused(place, f"{one_line(text)} is smaller than float64 holds (about 4.9e-324), and not 0.")
    return Number(value, place, pattern=_HEXADECIMAL_INTEGER.fullmatch(text) is not None)


def single(number: Number, written: str = "") -> Number:
    """The number rounded to float32; straight from the text where it is given, and else from float64, as C does both."""
    exact = Fraction(written) if number.value and _DECIMAL.fullmatch(written) else Fraction(number.value)
    try:
        magnitude = _nearest_single(abs(exact))
    except OverflowError:
        raise refused(number.place, f"{number.value} is larger than float32 holds (about 3.4e38).") from None
    if exact and not magnitude:
        raise refused(number.place, f"{number.value} is smaller than float32 holds (about 1.4e-45), and not 0.")
    return Number(-magnitude if exact < 0 else magnitude, number.place)


def _value(text: str) -> int | float:
    if _DECIMAL_INTEGER.fullmatch(text):
        return int(text)
    if _HEXADECIMAL_INTEGER.fullmatch(text):
        return int(text, 16)
    if _HEXADECIMAL.fullmatch(text):
        return float.fromhex(text)
    if not _DECIMAL.fullmatch(text):
        raise ValueError
    value = float(text)
    if abs(value) == float("inf"):
        raise OverflowError
    return value


def _is_zero(text: str) -> bool:
    lowered = text.lower()
    mantissa = lowered.partition("p")[0].partition("x")[2] if "x" in lowered else lowered.partition("e")[0]
    return not mantissa.strip("+-.0")


def _nearest_single(magnitude: Fraction) -> float:
    """Through float64 and then to the nearest of its neighbours: two roundings in a row can miss it by one."""
    pattern = int.from_bytes(struct.pack(">f", float(magnitude)), "big")
    near = [bits for bits in (pattern - 1, pattern, pattern + 1) if 0 <= bits < _INFINITE_SINGLE]
    return _of_bits(min(near, key=lambda bits: (abs(Fraction(_of_bits(bits)) - magnitude), bits & 1)))


def _of_bits(bits: int) -> float:
    value: float = struct.unpack(">f", bits.to_bytes(4, "big"))[0]
    return value
