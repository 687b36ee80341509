"""Writing source: lines with indentation, and the expressions of integer arithmetic in one or two words."""

from collections.abc import Iterator
from contextlib import contextmanager

from streamhost.formats import Word

SHORT, LIMIT, MOST = 1 << 31, 1 << 63, 1 << 127


class Text:
    """Lines of generated source."""

    def __init__(self) -> None:
        self.lines: list[str] = []
        self.depth = 0

    def __call__(self, line: str = "") -> None:
        self.lines.append("    " * self.depth + line if line else "")

    @contextmanager
    def indented(self) -> Iterator[None]:
        self.depth += 1
        yield
        self.depth -= 1

    def __str__(self) -> str:
        return "\n".join(self.lines) + "\n"


def comment(label: str) -> str:
    """A label behind a statement; what could end the line is left out."""
    return "  # " + "".join(character if character.isprintable() else "?" for character in label)


class Value:
    """An integer expression of a kernel: its text, the largest magnitude it can have, and whether it is two words.

    What stands in a word of 64 bits is one, though its magnitude may be 2^63; likewise `is_short` says that it fits 32 bits.
    """

    def __init__(self, text: str, bound: int, *, is_wide: bool | None = None, is_short: bool = False) -> None:
        assert bound < MOST, "lowering refuses what two words do not carry"
        self.text, self.bound = text, bound
        self.is_wide = bound >= LIMIT if is_wide is None else is_wide
        self.is_short = is_short or bound < SHORT

    def wide(self) -> "Value":
        return self if self.is_wide else Value(f"wide({self.text})", self.bound, is_wide=True)

    def as_wide_as(self, is_wide: bool) -> "Value":
        return self.wide() if is_wide else self

    def as_short_as_it_fits(self) -> "Value":
        """One word where the bound fits one: a floor may have left no more."""
        return Value(f"narrow({self.text})", self.bound) if self.is_wide and self.bound < LIMIT else self

    def left(self, k: int) -> "Value":
        if k == 0:
            return self
        if self.bound == 0 and k > 63:
            return ZERO
        bound = self.bound << k
        value = self.as_wide_as(bound >= LIMIT)
        return Value(f"({value.text} << {k})", bound, is_wide=value.is_wide)

    def floored(self, drop: int) -> "Value":
        """Shifted right by floor, or left where drop is negative."""
        if drop <= 0:
            return self.left(-drop)
        count = min(drop, 127 if self.is_wide else 63)
        return Value(f"({self.text} >> {count})", (self.bound >> drop) + 1, is_wide=self.is_wide)

    def plus(self, sign: int, other: "Value") -> "Value":
        bound = self.bound + other.bound
        is_wide = bound >= LIMIT or self.is_wide or other.is_wide
        first, second = self.as_wide_as(is_wide), other.as_wide_as(is_wide)
        return Value(f"({first.text} {'+' if sign > 0 else '-'} {second.text})", bound, is_wide=is_wide)

    def times(self, other: "Value") -> "Value":
        bound = self.bound * other.bound
        is_wide = bound >= LIMIT
        first, second = self.as_wide_as(is_wide), other.as_wide_as(is_wide)
        if self.is_short and other.is_short:
            return Value(f"(short({first.text}) * short({second.text}))", bound)
        return Value(f"({first.text} * {second.text})", bound, is_wide=is_wide)


ZERO = Value("np.int64(0)", 0)


def number(code: int, is_wide: bool) -> str:
    """An integer constant; a Wide beyond 64 bits is put together by a shift."""
    if not is_wide:
        return str(code)
    if -LIMIT <= code < LIMIT:
        return f"wide({code})"
    zeros = (code & -code).bit_length() - 1
    assert -LIMIT <= code >> zeros < LIMIT or code & (code + 1) == 0, "constants are powers of two, or one less"
    if -LIMIT <= code >> zeros < LIMIT:
        return f"(wide({code >> zeros}) << {zeros})"
    return f"((wide(1) << {code.bit_length()}) - wide(1))"


def rounded_text(value: Value, drop: int, rounding: str) -> Value:
    """A named rounding of a value (a variable, since it is read more than once) by `drop` bits."""
    if drop <= 0:
        return value.left(-drop)
    if drop > 127:  # less than half a step of the result
        return value.floored(drop) if rounding == "floor" else ZERO
    half, mask, bound = 1 << (drop - 1), (1 << drop) - 1, (value.bound >> drop) + 1
    adds = rounding in ("half-even", "half-away", "toward-zero")
    is_wide = value.is_wide or (adds and value.bound + mask >= LIMIT) or drop > 62
    a = value.as_wide_as(is_wide).text
    top = 127 if is_wide else 63
    if adds and value.bound + mask >= MOST:
        return Value(f"(({a} >> {drop}) + wide({rounds_up(a, drop, rounding)}))", bound, is_wide=True)
    if rounding == "floor":
        text = f"({a} >> {drop})"
    elif rounding == "half-up":
        text = f"(({a} >> {drop}) + (({a} >> {drop - 1}) & {number(1, is_wide)}))"
    elif rounding == "half-even":
        text = f"(({a} + {number(half - 1, is_wide)} + (({a} >> {drop}) & {number(1, is_wide)})) >> {drop})"
    elif rounding == "half-away":
        text = f"(({a} + {number(half, is_wide)} + ({a} >> {top})) >> {drop})"
    else:
        text = f"(({a} + (({a} >> {top}) & {number(mask, is_wide)})) >> {drop})"
    return Value(text, bound, is_wide=is_wide)


def rounds_up(a: str, drop: int, rounding: str) -> str:
    """1 where a Wide is rounded up from its floor, else 0, told from its bits: a sum with half a step could overflow."""
    half = f"(narrow({a} >> {drop - 1}) & 1)"
    below = f"differs({a} & {number((1 << drop - 1) - 1, True)}, wide(0))"
    if rounding == "half-even":
        return f"{half} & ({below} | narrow({a} >> {drop}))"
    if rounding == "half-away":
        return f"{half} & ({below} | narrow({a} >> 127) + 1)"
    return f"(narrow({a} >> 127) & 1) & ({half} | {below})"


def overflowed_text(value: Value, word: Word, overflow: str) -> str:
    """A value (a variable) brought into a word of at most 64 bits, as a 64-bit integer."""
    if overflow == "saturate":
        if value.is_wide:
            return f"clamp({value.text}, {word.low}, {word.high})"
        if word.bits == 64:
            return value.text
        return f"min(max({value.text}, {word.low}), {word.high})"
    low_bits = f"narrow({value.text})" if value.is_wide else value.text
    spare = 64 - word.bits
    return f"(({low_bits} << {spare}) >> {spare})" if spare else low_bits
