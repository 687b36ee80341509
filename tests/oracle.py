"""A second evaluator of the five forms, written from the specification of the arithmetic and from nothing else.

It knows no graph. Each form is its difference equations in the order in which they are added, on Python integers
(fixed point) or NumPy scalars and exact fractions (floating point). It shares no code with the package, and a format
is stated as the keywords of `Fixed` or `Float`, whose defaults are worked out here once more.
"""

import re
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, field, replace
from fractions import Fraction
from math import frexp
from typing import Any

import numpy as np

Section = tuple[Sequence[float], Sequence[float]]
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
        found.append(Coefficient(put_in(code, bits, "saturate"), fraction))
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
    """A code in a word. `seen` keeps what places have made of it in this frame."""

    code: int
    integer: int
    fraction: int
    seen: dict[Place, "Value"] = field(default_factory=dict)


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
        return Value(value.code, value.integer, value.fraction)

    def zero_state(self) -> Value:
        return Value(0, self.format.state.integer, self.format.state.fraction)

    def zero_like(self, value: Value) -> Value:
        return Value(0, value.integer, value.fraction)

    def quantized(self, value: Value, at: Place) -> Value:
        if (value.integer, value.fraction) == (at.integer, at.fraction):
            return value
        if at not in value.seen:
            value.seen[at] = Value(self._quantized(value, at), at.integer, at.fraction)
        return value.seen[at]

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
        running = exact = 0
        for term in terms:
            code = self._term(term, fraction)
            sign = -1 if term.negative else 1
            exact += sign * code
            if bits is None:
                running = exact
            else:
                code = put_in(code, bits, overflow) if overflow == "saturate" else code
                running = put_in(running + sign * code, bits, overflow)
        if bits is not None and not fits(exact, bits):
            self.counts.accumulator_overflows += 1
        return Value(running, 10**6, fraction)

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

    def register(self, total: Value, *, delayed: bool) -> Value:
        return self.quantized(total, self.format.state if delayed else self.format.signal)

    def pre_sum(self, first: Value, second: Value) -> Any:
        """The sum of two stored values that only gains read, and how they read it."""
        if self.format.pre_sum == "signal":
            return self.register(self.sum([first, second]), delayed=False)
        fraction = max(first.fraction, second.fraction)
        code = sum(v.code << (fraction - v.fraction) for v in (first, second))
        longest = max(first.integer, second.integer)
        if self.format.pre_sum == "half":
            half = Value(code, longest, fraction + 1)
            return self.quantized(half, self.format.signal), self.format.operand, 1
        # Two values of m and n integer bits always need max(m, n) + 1.
        wide = replace(self.format.operand, integer=self.format.operand.integer + 1)
        return Value(code, longest + 1, fraction), wide, 0


# --- floating point


class FloatArithmetic:
    """The same in IEEE 754 binary32 or binary64, ties to even."""

    def __init__(self, type: str, accumulator: str | None, fused: bool, flush_subnormals: bool) -> None:
        self.type = {"float32": np.float32, "float64": np.float64}[type]
        self.wide = np.float64 if accumulator == "float64" else self.type
        self.fused, self.flush = fused, flush_subnormals

    def start(self, sample: Any) -> Any:
        return self.type(sample)

    def end(self, y: Any) -> float:
        return float(self.type(y))

    def store(self, value: Any) -> Any:
        tiny = np.finfo(self.type).tiny
        return self.type(0) if self.flush and abs(value) < tiny else self.type(value)

    def zero_state(self) -> Any:
        return self.type(0)

    def zero_like(self, value: Any) -> Any:
        return self.type(0)

    def times(self, coefficient: float, value: Any) -> tuple[Any, Any]:
        return self.wide(self.type(coefficient)), self.wide(self.type(value))

    def minus_times(self, coefficient: float, value: Any) -> tuple[Any, Any]:
        c, v = self.times(coefficient, value)
        return -c, v

    def sum(self, terms: Sequence[Any]) -> Any:
        total = None
        for term in terms:
            if total is None:
                total = term[0] * term[1] if isinstance(term, tuple) else self.wide(term)
            elif not isinstance(term, tuple):
                total = total + self.wide(term)
            elif self.fused:
                total = self._fma(term[0], term[1], total)
            else:
                total = total + term[0] * term[1]
        return total

    def _fma(self, c: Any, v: Any, s: Any) -> Any:
        exact = Fraction(float(c)) * Fraction(float(v)) + Fraction(float(s))
        return nearest_float(exact, self.wide) if exact else c * v + s

    def register(self, total: Any, *, delayed: bool) -> Any:
        return self.type(total)

    def pre_sum(self, first: Any, second: Any) -> Any:
        return self.sum([first, second])


def nearest_float(exact: Fraction, type: Any) -> Any:
    """The nearest number of the type, ties to even, rounded once."""
    facts = np.finfo(type)
    size = abs(exact)
    exponent = size.numerator.bit_length() - size.denominator.bit_length()
    exponent -= size < Fraction(2) ** exponent
    step = Fraction(2) ** (max(exponent, int(facts.minexp)) - int(facts.nmant))
    return type(float(round(exact / step) * step))


# --- the forms: what is added, in its order


def filled(m: Any, s: Stored, name: str, length: int, zero: Any) -> list[Any]:
    if name not in s.lines:
        s.lines[name] = [m.store(zero) for _ in range(length)]
    return s.lines[name]


def push(m: Any, s: Stored, name: str, newest: Any) -> None:
    line = s.lines[name]
    s.lines[name] = [m.store(value) for value in [newest, *line][: len(line)]]


def direct_1(m: Any, s: Stored, x: Any, last: bool) -> Any:
    """y = b2 x2 - a2 y2 + b1 x1 - a1 y1 + b0 x."""
    recursive = len(s.a) > 1
    xs = [x, *filled(m, s, "x", len(s.b) - 1, m.zero_like(x))]
    ys = [None, *filled(m, s, "y", len(s.a) - 1, m.zero_state())]
    terms = []
    for k in reversed(range(max(len(s.b), len(s.a)))):
        if k < len(s.b):
            terms.append(m.times(s.b[k], xs[k]))
        if 1 <= k < len(s.a):
            terms.append(m.minus_times(s.a[k], ys[k]))
    y = m.sum(terms)
    if recursive or last:
        y = m.register(y, delayed=recursive)
    push(m, s, "x", x)
    push(m, s, "y", y)
    return y


def direct_2(m: Any, s: Stored, x: Any, last: bool, *, swapped: bool = False) -> Any:
    """w = -a2 w2 - a1 w1 + x; y = b2 w2 + b1 w1 + b0 w. Swapped: each half on delays of its own."""
    recursive = len(s.a) > 1
    stores = max(len(s.a), len(s.b)) > 1
    open_gain = not isinstance(x, Value | np.generic)
    zero = m.zero_state() if recursive or open_gain else m.zero_like(x)
    length = len(s.a) - 1 if swapped else max(len(s.a), len(s.b)) - 1
    ws = filled(m, s, "w", length, zero)
    vs = filled(m, s, "v", len(s.b) - 1, zero) if swapped else ws
    w = x
    if recursive or open_gain:
        w = m.sum([*(m.minus_times(s.a[k], ws[k - 1]) for k in reversed(range(1, len(s.a)))), x])
        w = m.register(w, delayed=stores)
    y = m.sum([m.times(s.b[k], [w, *vs][k]) for k in reversed(range(len(s.b)))])
    if last:
        y = m.register(y, delayed=False)
    push(m, s, "w", w)
    if swapped:
        push(m, s, "v", w)
    return y


def direct_1_swapped(m: Any, s: Stored, x: Any, last: bool) -> Any:
    return direct_2(m, s, x, last, swapped=True)


def transposed_1(m: Any, s: Stored, x: Any, last: bool) -> Any:
    """v = x + s1; s1 = -a1 v + s2; s2 = -a2 v; y = b0 v + t1; t1 = b1 v + t2; t2 = b2 v."""
    ss = filled(m, s, "s", len(s.a) - 1, m.zero_state())
    ts = filled(m, s, "t", len(s.b) - 1, m.zero_state())
    if not isinstance(x, Value | np.generic):
        v = m.register(m.sum([x, *ss[:1]]), delayed=False)
    else:
        v = m.pre_sum(x, ss[0]) if ss else x
    new_s = [m.register(m.sum([m.minus_times(s.a[k], v), *ss[k : k + 1]]), delayed=True) for k in range(1, len(s.a))]
    y = m.sum([m.times(s.b[0], v), *ts[:1]])
    if last:
        y = m.register(y, delayed=False)
    new_t = [m.register(m.sum([m.times(s.b[k], v), *ts[k : k + 1]]), delayed=True) for k in range(1, len(s.b))]
    s.lines["s"], s.lines["t"] = [m.store(v) for v in new_s], [m.store(v) for v in new_t]
    return y


def transposed_2(m: Any, s: Stored, x: Any, last: bool) -> Any:
    """y = b0 x + s1; s1 = b1 x - a1 y + s2; s2 = b2 x - a2 y."""
    ss = filled(m, s, "s", max(len(s.a), len(s.b)) - 1, m.zero_state())
    y = m.sum([m.times(s.b[0], x), *ss[:1]])
    if len(s.a) > 1 or last:
        y = m.register(y, delayed=False)
    new = []
    for k in range(1, len(ss) + 1):
        terms = [m.times(s.b[k], x)] if k < len(s.b) else []
        terms += [m.minus_times(s.a[k], y)] if k < len(s.a) else []
        new.append(m.register(m.sum([*terms, *ss[k : k + 1]]), delayed=True))
    s.lines["s"] = [m.store(v) for v in new]
    return y


FORMS: dict[str, Callable[..., Any]] = {
    "direct-1": direct_1, "direct-1-swapped": direct_1_swapped, "direct-2": direct_2,
    "transposed-1": transposed_1, "transposed-2": transposed_2,
}


def frame(m: Any, sections: Sequence[Stored], front: Any, form: str, sample: Any) -> Any:
    """One instant: a register between two sections, the last section's output through the output's word."""
    signal = m.start(sample)
    if front is not None:
        signal = m.times(front, signal)
    for index, section in enumerate(sections):
        if index > 0:
            # Of the five only direct-1 puts the section's input on delays at all times, and those without recursion
            # that have it for their w.
            reads = len(section.b) > 1 and (form == "direct-1" or (len(section.a) == 1 and "direct" in form))
            signal = m.register(signal, delayed=reads)
        signal = FORMS[form](m, section, signal, index == len(sections) - 1)
    return m.end(signal)


def run_fixed(
    sections: Sequence[Section], form: str, codes: Iterable[int], *, channel: int = 0, front: float | None = None,
    **parameters: Any,
) -> tuple[list[int], Counts]:
    """Output codes and counts for input codes; `parameters` are the keywords of a fixed-point format.

    Sections are (b, a) without trailing zeros, a[0] = 1, in the order in which they are drawn. Raises Refused.
    """
    format = Format(**parameters)
    m = FixedArithmetic(format, channel)
    held, gain = stored(sections, front, format)
    return [frame(m, held, gain, form, code) for code in codes], m.counts


def run_float(
    sections: Sequence[Section], form: str, samples: Iterable[float], *, front: float | None = None,
    type: str = "float64", accumulator: str | None = None, fused: bool = False, flush_subnormals: bool = False,
) -> list[float]:
    """Output samples for input samples in floating point."""
    m = FloatArithmetic(type, accumulator, fused, flush_subnormals)
    held = [Stored(list(b), list(a)) for b, a in sections]
    with np.errstate(under="ignore"):
        return [frame(m, held, front, form, sample) for sample in samples]
