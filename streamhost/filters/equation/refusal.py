"""How an equation is refused: what is wrong and what is allowed in one line, then the place with a mark under it."""

from streamhost.errors import FilterError

WIDTH = 72
FIRST_COMBINING = 0x300
"""From here on a character may take no column, or two, and the mark below it would stand elsewhere."""


def refused(text: str, position: int, message: str) -> FilterError:
    """The error; its first line says all, its second and third show the line of the equation with ^ under the column."""
    before = text[:position]
    number, start = before.count("\n") + 1, before.rfind("\n") + 1
    line, column = text[start:].partition("\n")[0], position - start
    place = f"line {number}, column {column + 1}" if "\n" in text.strip() else f"column {column + 1}"
    return FilterError(f"equation, {place}: {message}\n{_marked(line, column)}")


def quoted(character: str) -> str:
    """A character as a message can carry it."""
    return f'"{character}"' if character.isprintable() else f"U+{ord(character):04X}"


def shortened(name: str) -> str:
    return f'"{name}"' if len(name) <= 20 else f'"{name[:20]}..."'


def _marked(line: str, column: int) -> str:
    start = max(0, min(column - WIDTH // 2, len(line) - WIDTH))
    before = "..." if start else ""
    after = "..." if len(line) > start + WIDTH else ""
    shown = "".join(map(_shown, line[start : start + WIDTH]))
    return f"    {before}{shown}{after}\n    {' ' * (len(before) + column - start)}^"


def _shown(character: str) -> str:
    if character.isspace():
        return " "
    return character if character.isprintable() and ord(character) < FIRST_COMBINING else "?"
