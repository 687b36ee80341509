"""Writing source: lines with indentation, and the expressions of integer arithmetic in one or two words."""

from collections.abc import Iterator
from contextlib import contextmanager

from streamhost.formats import Word

LIMIT = 1 << 63


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
    """An integer expression of a kernel: its text, the largest magnitude it can have, and whether it is two words."""

    def __init__(self, text: str, bound: int, *, is_wide: bool | None = None) -> None:
        self.text, self.bound = text, bound
        self.is_wide = bound >= LIMIT if is_wide is None else is_wide

    def wide(self) -> "Value":
        return self if self.is_wide else Value(f"wide({self.text})", self.bound, is_wide=True)

    def as_wide_as(self, is_wide: bool) -> "Value":
        return self.wide() if is_wide else self

    def left(self, k: int) -> "Value":
        if k == 0:
            return self
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
        return Value(f"({self.as_wide_as(is_wide).text} * {other.as_wide_as(is_wide).text})", bound, is_wide=is_wide)


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
    half, mask, bound = 1 << (drop - 1), (1 << drop) - 1, (value.bound >> drop) + 1
    adds = rounding in ("half-even", "half-away", "toward-zero")
    is_wide = value.is_wide or (adds and value.bound + mask >= LIMIT) or drop > 62
    a = value.as_wide_as(is_wide).text
    top = 127 if is_wide else 63
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


def overflowed_text(value: Value, word: Word, overflow: str) -> str:
    """A value (a variable) brought into a word of at most 64 bits, as a 64-bit integer."""
    if overflow == "saturate":
        if value.is_wide:
            return f"clamp({value.text}, {word.low}, {word.high})"
        return f"min(max({value.text}, {word.low}), {word.high})"
    low_bits = f"narrow({value.text})" if value.is_wide else value.text
    spare = 64 - word.bits
    return f"(({low_bits} << {spare}) >> {spare})" if spare else low_bits
