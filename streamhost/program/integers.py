"""Rounding and overflow on Python integers of any size: what the names of roundings and overflows mean."""

from fractions import Fraction

from streamhost.formats import Word


def rounded(code: int, drop: int, rounding: str) -> int:
    """`code` with its last `drop` bits rounded away; for drop <= 0 shifted left exactly."""
    if drop <= 0:
        return code << -drop
    floor, half = code >> drop, 1 << (drop - 1)
    rest = code - (floor << drop)
    up = {
        "floor": False,
        "half-up": rest >= half,
        "half-even": rest > half or (rest == half and floor % 2 == 1),
        "half-away": rest > half or (rest == half and code >= 0),
        "toward-zero": code < 0 and rest > 0,
    }[rounding]
    return floor + int(up)


def rounded_value(value: Fraction, fraction: int, rounding: str) -> int:
    """The code of an exact value at `fraction` fraction bits."""
    scaled = value * (Fraction(2) ** fraction)
    floor = scaled.numerator // scaled.denominator
    rest = scaled - floor
    half = Fraction(1, 2)
    up = {
        "floor": False,
        "half-up": rest >= half,
        "half-even": rest > half or (rest == half and floor % 2 == 1),
        "half-away": rest > half or (rest == half and scaled > 0),
        "toward-zero": scaled < 0 and rest > 0,
    }[rounding]
    return floor + int(up)


def wrapped(code: int, word: Word) -> int:
    """`code` modulo the word's range."""
    return (code - word.low) % (1 << word.bits) + word.low


def saturated(code: int, word: Word) -> int:
    return min(max(code, word.low), word.high)


def overflowed(code: int, word: Word, overflow: str) -> int:
    """`code` brought into the word as `overflow` says."""
    return saturated(code, word) if overflow == "saturate" else wrapped(code, word)
