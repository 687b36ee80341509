"""Fixed point for the second evaluator: coefficients as stored, sums and registers.

Written from the specification of the arithmetic; shares no code with the package.
"""

from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from fractions import Fraction
from math import frexp
from typing import Any

from oracle_words import Format, Place, Refused, carried, draws, fits, put_in, rounded, shifted, word

Section = tuple[Sequence[float], Sequence[float]]

# --- coefficients


@dataclass(frozen=True)
class Coefficient:
    code: int
    fraction: int


@dataclass
class Stored:
    """A section with its coefficients as stored (a[0] is None), and what its delays hold."""

    b: list[Any]
    a: list[Any]
    lines: dict[str, list[Any]] = field(default_factory=dict)


def in_word(value: float, fraction: int, how: str) -> int:
    scaled = Fraction(value) * Fraction(2) ** fraction
    return rounded(scaled.numerator, scaled.denominator.bit_length() - 1, how)


def integer_bits(values: Sequence[float], bits: int, how: str, least: int | None) -> int:
    """The m of a group: the smallest for which every value fits."""
    largest = max(abs(value) for value in values)
    if largest == 0:
        return 1
    m = frexp(largest)[1] - 3
    while not all(fits(in_word(value, bits - m, how), bits) for value in values):
        m += 1
    return m if least is None else max(m, least)


def one_group(values: Sequence[float], format: Format) -> list[Coefficient]:
    rule = format.coefficients
    how, bits = rule.get("rounding", "half-away"), rule["bits"]
    if "word" in rule:
        integer, fraction = word(rule["word"])
        bits = integer + fraction
    else:
        fraction = bits - integer_bits(values, bits, how, 1 if "bits" in format.accumulator else None)
    found = []
    for value in values:
        code = in_word(value, fraction, how)
        if not fits(code, bits) and not format.clamping:
            raise Refused(f"coefficient {value} does not fit")
        if code == 0 and value != 0 and not format.vanishing:
            raise Refused(f"coefficient {value} becomes 0")
        kept = put_in(code, bits, "saturate")
        if kept != code and int(float(kept)) != kept:
            raise Refused(f"coefficient {value} would be clamped to what no float64 is")
        found.append(Coefficient(kept, fraction))
    return found


def stored(sections: Sequence[Section], front: float | None, format: Format) -> tuple[list[Stored], Any]:
    """The sections as stored and the gain in front, which belongs to the first section's b."""
    sign = -1 if format.negated else 1
    polynomials: list[list[float]] = []
    for b, a in sections:
        polynomials += [list(b), [sign * value for value in a[1:]]]
    if front is not None:
        polynomials[0] = [front, *polynomials[0]]
    point = "coefficient" if "word" in format.coefficients else format.coefficients.get("point", "section")
    size = {"section": 2, "polynomial": 1, "realization": len(polynomials), "coefficient": 0}[point]
    flat: list[Coefficient] = []
    if size == 0:
        flat = [one_group([value], format)[0] for polynomial in polynomials for value in polynomial]
    else:
        for start in range(0, len(polynomials), size):
            group = [value for polynomial in polynomials[start : start + size] for value in polynomial]
            flat += one_group(group, format) if group else []
    codes = iter(flat)
    gain = next(codes) if front is not None else None
    return [Stored([next(codes) for _ in b], [None, *(next(codes) for _ in a[1:])]) for b, a in sections], gain


# --- fixed point


@dataclass(eq=False)
class Value:
    """A code in a word. `seen` keeps what places have made of it in this frame.

    `bound` and `own`: the largest magnitude and the fraction bits at which a machine holds it, which a longer word does
    not change; those of the word unless said.
    """

    code: int
    integer: int
    fraction: int
    bound: int = -1
    own: int = -1
    seen: dict[Place, "Value"] = field(default_factory=dict)

    def __post_init__(self) -> None:
        if self.bound < 0:
            self.bound, self.own = 1 << (self.integer + self.fraction - 1), self.fraction


@dataclass
class Counts:
    saturations: int = 0
    wraps: int = 0
    accumulator_overflows: int = 0


@dataclass
class Product:
    """A product before its rounding; a coefficient of None is a term without multiplication."""

    negative: bool
    coefficient: Coefficient | None
    value: Value
    shift: int = 0


class FixedArithmetic:
    """Sums, products and registers of one channel in a fixed-point format."""

    def __init__(self, format: Format, channel: int) -> None:
        self.format, self.channel = format, channel
        self.counts, self.frame, self.ordinal = Counts(), 0, 0

    def start(self, sample: Any) -> Value:
        self.ordinal = 0
        return Value(int(sample), self.format.input.integer, self.format.input.fraction)

    def end(self, y: Value) -> int:
        code = self.quantized(y, self.format.output).code
        self.frame += 1
        return code

    def store(self, value: Value) -> Value:
        return replace(value, seen={})

    def zero_state(self) -> Value:
        return Value(0, self.format.state.integer, self.format.state.fraction)

    def zero_like(self, value: Value) -> Value:
        return replace(value, code=0, seen={})

    def quantized(self, value: Value, at: Place) -> Value:
        if (value.integer, value.fraction) == (at.integer, at.fraction):
            return value
        if at not in value.seen:
            held = value.integer <= at.integer and value.fraction <= at.fraction
            self._check_room(value, at, held=held)
            as_it_was = (value.bound, value.own) if held else ()
            value.seen[at] = Value(self._quantized(value, at), at.integer, at.fraction, *as_it_was)
        return value.seen[at]

    def _check_room(self, value: Value, at: Place, *, held: bool) -> None:
        """A register is one word of 64 bits; on the way into it a code may gain bits, or a dither, within two."""
        if held:
            return
        if at.bits > 64:
            raise Refused(f"a register of {at.bits} bits")
        drop = value.own - at.fraction
        if drop <= 0:
            carried(value.bound << -drop)
        elif at.dither:
            carried(value.bound + (1 << drop))

    def _quantized(self, value: Value, at: Place) -> int:
        drop, code = value.fraction - at.fraction, value.code
        if drop > 0:
            self.ordinal += 1
            if at.dither:
                u = [r >> (64 - drop) if drop <= 64 else r << (drop - 64)
                     for r in draws(self.format.seed, self.ordinal, self.channel, self.frame)]
                code += u[0] - u[1]
        code = rounded(code, drop, at.rounding)
        if not fits(code, at.bits):
            if at.overflow == "saturate":
                self.counts.saturations += 1
            else:
                self.counts.wraps += 1
        return put_in(code, at.bits, at.overflow)

    def times(self, coefficient: Coefficient, value: Any) -> Product:
        if isinstance(value, tuple):
            value, operand, shift = value
        else:
            operand, shift = self.format.operand, 0
        return Product(False, coefficient, self.quantized(value, operand), shift)

    def minus_times(self, coefficient: Coefficient, value: Any) -> Product:
        product = self.times(coefficient, value)
        product.negative = not self.format.negated
        return product

    def sum(self, terms: Sequence[Product | Value]) -> Value:
        """The terms added in their order in the accumulator, not yet a register."""
        terms = [Product(False, None, term) if isinstance(term, Value) else term for term in terms]
        fraction, bits = self._accumulator(terms)
        overflow = self.format.accumulator.get("overflow", "wrap")
        running = exact = bound = 0
        for term in terms:
            code = self._term(term, fraction)
            bound += self._bound(term, fraction)
            sign = -1 if term.negative else 1
            exact += sign * code
            if bits is None:
                running = exact
            else:
                code = put_in(code, bits, overflow) if overflow == "saturate" else code
                running = put_in(running + sign * code, bits, overflow)
        # In an accumulator that wraps these are the exact sums out of range. In one that saturates, a sum is lost too
        # where a term or a part of the sum was clipped and the whole would have fitted.
        if running != exact:
            self.counts.accumulator_overflows += 1
        bound = carried(bound)
        return Value(running, 10**6, fraction, bound if bits is None else min(bound, 1 << (bits - 1)), fraction)

    def _accumulator(self, terms: Sequence[Product]) -> tuple[int, int | None]:
        """Fraction bits of the accumulator and its length; None for as long as it takes."""
        rule = self.format.accumulator
        if "word" in rule:
            integer, fraction = word(rule["word"])
            return fraction, integer + fraction
        exact = [t.value.fraction + t.coefficient.fraction for t in terms if t.coefficient]
        plain = [t.value.fraction for t in terms if not t.coefficient]
        if "bits" not in rule:
            kept = self.format.product_fraction
            return max(plain + [f if kept is None else min(f, kept) for f in exact]), None
        fraction = max(exact or plain) - rule.get("drop", 0)
        if rule["bits"] - fraction < 1:
            raise Refused(f"{rule['bits']} bits leave no sign bit beside {fraction} fraction bits")
        return fraction, rule["bits"]

    def _term(self, term: Product, fraction: int) -> int:
        if term.coefficient is None:
            return rounded(term.value.code, term.value.fraction - fraction, "floor")
        exact = term.value.fraction + term.coefficient.fraction
        kept = min(f for f in (self.format.product_fraction, fraction, exact) if f is not None)
        code = rounded(term.coefficient.code * term.value.code, exact - kept, self.format.product_rounding)
        return rounded(code, kept - fraction, "floor") << term.shift

    def _bound(self, term: Product, fraction: int) -> int:
        """The largest magnitude that a term brings: product, rounding and both shifts within two words."""
        at, bound, kept = term.value.own, term.value.bound, term.value.own
        if term.coefficient is not None:
            at += term.coefficient.fraction
            bound = carried(bound * abs(term.coefficient.code))
            kept = min(f for f in (self.format.product_fraction, fraction, at) if f is not None)
        bound = carried((bound if kept == at else shifted(bound, kept - at)) << term.shift)
        return carried(shifted(bound, fraction - kept))

    def register(self, total: Value, *, delayed: bool) -> Value:
        at = self.format.state if delayed else self.format.signal
        if total.integer <= at.integer and total.fraction <= at.fraction:
            return total  # between sections: what a word holds already stays as it is
        return self.quantized(total, at)

    def pre_sum(self, first: Value, second: Value) -> Any:
        """The sum of two stored values that only gains read, and how they read it."""
        if self.format.pre_sum == "signal":
            return self.register(self.sum([first, second]), delayed=False)
        fraction = max(first.fraction, second.fraction)
        code = sum(v.code << (fraction - v.fraction) for v in (first, second))
        own = max(first.own, second.own)
        bound = sum(v.bound << (own - v.own) for v in (first, second))
        longest = max(first.integer, second.integer)
        if self.format.pre_sum == "half":
            half = Value(code, longest, fraction + 1, bound, own + 1)
            return self.quantized(half, self.format.signal), self.format.operand, 1
        # Two values of m and n integer bits always need max(m, n) + 1.
        wide = replace(self.format.operand, integer=self.format.operand.integer + 1)
        return Value(code, longest + 1, fraction, bound, own), wide, 0
