"""Words and formats for the second evaluator, on Python integers: one number, its limits, and the eight places.

Written from the specification of the arithmetic; shares no code with the package. A format is stated as the keywords
of `Fixed`, whose defaults are worked out here once more.
"""

import re
from dataclasses import dataclass, replace
from typing import Any

MASK = 2**64 - 1


class Refused(Exception):  # noqa: N818
    """The specification refuses this format for this filter."""


# --- one number


def rounded(code: int, drop: int, how: str) -> int:
    """`code` without its last `drop` bits, rounded as named; shifted left where there are none to drop."""
    if drop <= 0:
        return code << -drop
    floor, rest, half = code >> drop, code & ((1 << drop) - 1), 1 << (drop - 1)
    up = {
        "half-up": rest >= half,
        "half-even": rest > half or (rest == half and floor % 2 == 1),
        "half-away": rest > half or (rest == half and code > 0),
        "floor": False,
        "toward-zero": rest > 0 and code < 0,
    }
    return floor + up[how]


def put_in(code: int, bits: int, overflow: str) -> int:
    low, high = -(1 << (bits - 1)), (1 << (bits - 1)) - 1
    if overflow == "saturate":
        return min(max(code, low), high)
    return (code - low) % (1 << bits) + low


def fits(code: int, bits: int) -> bool:
    return put_in(code, bits, "saturate") == code


def carried(bound: int) -> int:
    """The largest magnitude of a value, which may take two words of 64 bits and no more."""
    if bound >= 1 << 127:
        raise Refused(f"{bound.bit_length() + 1} bits are more than 128")
    return bound


def shifted(bound: int, left: int) -> int:
    """A largest magnitude after a shift; a rounding to the right may add one."""
    return bound << left if left >= 0 else (bound >> -left) + 1


def mix(z: int) -> int:
    z = (z ^ (z >> 30)) * 0xBF58476D1CE4E5B9 & MASK
    z = (z ^ (z >> 27)) * 0x94D049BB133111EB & MASK
    return z ^ (z >> 31)


def draws(seed: int, ordinal: int, channel: int, frame: int) -> tuple[int, int]:
    """The two 64-bit words of one dithered rounding."""
    step = 0x9E3779B97F4A7C15
    key = mix(seed + step & MASK)
    key = mix(key + step * (ordinal + 1) & MASK)
    key = mix(key + step * (channel + 1) & MASK)
    first, second = (mix(key + step * (2 * frame + j + 1) & MASK) for j in (0, 1))
    return first, second


# --- a format, from the keywords


@dataclass(frozen=True)
class Place:
    integer: int
    fraction: int
    rounding: str = "half-up"
    overflow: str = "saturate"
    dither: bool = False

    @property
    def bits(self) -> int:
        return self.integer + self.fraction


def word(text: str) -> tuple[int, int]:
    integer, fraction = re.fullmatch(r"Q(-?\d+)\.(\d+)", text).groups()  # type: ignore[union-attr]
    return int(integer), int(fraction)


def place(given: Any, default: Place) -> Place:
    """What is stated at a place, the rest from its default."""
    table = {"word": given} if isinstance(given, str) else dict(given or {})
    if "word" in table:
        integer, fraction = word(table.pop("word"))
        default = replace(default, integer=integer, fraction=fraction)
    if "dither" in table:
        table["dither"] = table["dither"] == "tpdf"
    return replace(default, **table)


class Format:
    """The eight places of a fixed-point format, resolved from its keywords."""

    def __init__(
        self, signal: Any = "Q1.15", *, input: Any = None, coefficients: Any = None, operand: Any = None,
        product: Any = None, accumulator: Any = "full", state: Any = None, output: Any = None,
        rounding: str = "half-up", rounding_place: str = "sum", overflow: str = "saturate",
        feedback: str = "subtracted", pre_sum: str = "exact", dither: str | None = None, dither_seed: int = 0,
        allow_vanishing: bool = False, allow_clamping: bool = False,
    ) -> None:
        short = Place(1, 15, rounding, overflow, dither == "tpdf")
        self.signal = place(signal, short)
        at_signal = replace(short, integer=self.signal.integer, fraction=self.signal.fraction)
        self.input = place(input, replace(at_signal, rounding="half-even", overflow="saturate", dither=False))
        self.operand = place(operand, self.signal)
        self.state, self.output = place(state, at_signal), place(output, at_signal)
        self.coefficients = {"word": coefficients} if isinstance(coefficients, str) else dict(coefficients or {})
        self.coefficients.setdefault("bits", self.signal.bits)
        self.product_fraction, self.product_rounding = self._product(product, rounding_place, rounding)
        if not isinstance(accumulator, dict):
            accumulator = {"bits" if isinstance(accumulator, int) else "word": accumulator}
        self.accumulator = {key: value for key, value in accumulator.items() if value != "full"}
        self.negated = feedback == "negated"
        self.pre_sum, self.seed = pre_sum, dither_seed
        self.vanishing, self.clamping = allow_vanishing, allow_clamping

    def _product(self, product: Any, rounding_place: str, rounding: str) -> tuple[int | None, str]:
        if rounding_place == "product":
            return self.signal.fraction, rounding
        table = product if isinstance(product, dict) else {"bits": "exact" if product is None else product}
        bits = table.get("bits", "exact")
        return None if bits == "exact" else bits, table.get("rounding", "floor")
