"""Numbers and names as the report writes them."""

from collections.abc import Sequence
from html import escape as _escape
from math import isinf, isnan

MINUS = "\N{MINUS SIGN}"
NOT_GIVEN = "\N{EN DASH}"
NO_BREAK = "\N{NO-BREAK SPACE}"
SPACES = f"\n{NO_BREAK}"
NUMERALS = ("none", "one", "two", "three", "four", "five", "six", "seven", "eight", "nine", "ten", "eleven", "twelve")


def escape(text: str) -> str:
    """Text for HTML and SVG, in content and in attributes: titles and names come from files of others."""
    shown = (each if each.isprintable() or each in SPACES else "\N{REPLACEMENT CHARACTER}" for each in text)
    return _escape("".join(shown))


def number(value: float | None, decimals: int = 1) -> str:
    """With U+2212 as minus; a dash for what is not given."""
    if value is None or isnan(value):
        return NOT_GIVEN
    if isinf(value):
        return "\N{INFINITY}" if value > 0 else f"{MINUS}\N{INFINITY}"
    text = f"{value:.{decimals}f}"
    return text.replace("-", MINUS if any(digit in "123456789" for digit in text) else "")


def short(value: float) -> str:
    """A stated number with as few digits as it has."""
    return f"{value:g}".replace("-", MINUS)


def hertz(value: float) -> str:
    """A frequency with three digits and its unit."""
    return f"{value / 1000.0:.3g} kHz" if value >= 999.5 else f"{value:.3g} Hz"


def counted(count: int) -> str:
    """A count as a word up to twelve."""
    return NUMERALS[count] if count < len(NUMERALS) else str(count)


def several(count: int, one: str, more: str = "") -> str:
    """The count with its noun."""
    return f"{count:,} {one if count == 1 else more or one + 's'}"


def listed(parts: Sequence[str], word: str = "and") -> str:
    """Parts as a sentence lists them."""
    *others, last = parts
    return f"{', '.join(others)} {word} {last}" if others else last


def ranges(numbers: Sequence[int]) -> str:
    """Numerals with runs of three or more drawn together: "1, 2 and 4 to 6"."""
    runs: list[list[int]] = []
    for each in sorted(numbers):
        if runs and each == runs[-1][-1] + 1:
            runs[-1].append(each)
        else:
            runs.append([each])
    parts: list[str] = []
    for run in runs:
        parts += [f"{run[0]} to {run[-1]}"] if len(run) > 2 else [str(each) for each in run]
    return listed(parts)


def grouped(said: Sequence[tuple[int, str]]) -> str:
    """What is said of each number, alike together: "0.1 dB for 1 and 3, 0.2 dB for 2"; of one alone without its number."""
    alike: dict[str, list[int]] = {}
    for each, text in said:
        alike.setdefault(text, []).append(each)
    if len(said) == 1:
        return said[0][1]
    return listed([f"{text} for {ranges(numbers)}" for text, numbers in alike.items()])


def sentence(text: str) -> str:
    """With a capital and a full stop."""
    return text[:1].upper() + text[1:] + ("" if text.endswith((".", "!", "?")) else ".")
