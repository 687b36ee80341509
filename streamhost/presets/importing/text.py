"""Coefficients in lines of text: rows of sections, under a line of column names or not, or lines of b and of a."""

import re
from collections.abc import Sequence
from dataclasses import dataclass

from streamhost.errors import RequestError
from streamhost.presets.importing.columns import COEFFICIENTS, NAMES
from streamhost.presets.importing.literals import literal
from streamhost.presets.importing.stated import Flat, Lists, Numbers, Reading, Rows, checked_count, refused
from streamhost.presets.mistakes import listed, one_line

SEPARATORS = (";", ",")
"""The first of them that a line has separates its numbers; a line without any is separated by blanks."""

_COMMENT = re.compile(r"(#|%|//).*")
_KEYED = re.compile(r"\s*([ab])\s*[\s=:,;]", re.IGNORECASE)


@dataclass(frozen=True)
class _Item:
    text: str
    place: str


@dataclass(frozen=True)
class _Line:
    """The items of a line; `key` is b or a where the line begins with it."""

    key: str | None
    items: tuple[_Item, ...]
    place: str


def read_text(text: str) -> Reading:
    """Rows, lists or one list of numbers. RequestError with line and column."""
    written = enumerate(text.replace("\N{MINUS SIGN}", "-").split("\n"), 1)
    stated = [(line, number) for number, line in written if _COMMENT.sub("", line).strip()]
    checked_count(len(stated))
    lines = [_line(*each) for each in stated]
    if not lines:
        raise RequestError("the file has no numbers in it.")
    if any(line.key for line in lines):
        return Reading(_lists(lines))
    return _rows(lines)


def _line(line: str, number: int) -> _Line:
    body = _COMMENT.sub("", line).rstrip().removesuffix(";")
    keyed = _KEYED.match(body)
    start = keyed.end() if keyed else 0
    items = tuple(_Item(item, f"line {number}, column {column}") for item, column in _items(body[start:], start + 1))
    return _Line(keyed[1].lower() if keyed else None, items, f"line {number}")


def _items(body: str, column: int) -> list[tuple[str, int]]:
    """What stands between separators, each with its column; one separator at the end separates nothing."""
    if body.lstrip().startswith("[") and body.rstrip().endswith("]"):
        body = body.replace("[", " ", 1).rstrip().removesuffix("]")
    separator = next((mark for mark in SEPARATORS if mark in body), None)
    if separator is None:
        return [(match[0], column + match.start()) for match in re.finditer(r"\S+", body)]
    items = []
    for part in body.split(separator):
        items.append((_unquoted(part.strip()), column + len(part) - len(part.lstrip())))
        column += len(part) + 1
    return items[:-1] if not items[-1][0] else items


def _unquoted(item: str) -> str:
    return item[1:-1].strip() if len(item) > 1 and item[0] == item[-1] == '"' else item


def _numbers(line: _Line) -> Numbers:
    if not line.items:
        raise refused(line.place, "no numbers stand here.")
    checked_count(len(line.items))
    return tuple(literal(item.text, item.place) for item in line.items)


def _lists(lines: Sequence[_Line]) -> Lists:
    """A line of a belongs to the line of b before it."""
    pairs: list[tuple[Numbers, Numbers]] = []
    for line in lines:
        if line.key == "b":
            pairs.append((_numbers(line), ()))
        elif line.key is None:
            raise refused(line.place, "this line begins with neither b nor a, as others here do: each list is one line.")
        elif not pairs or pairs[-1][1]:
            raise refused(line.place, "this line of a has no line of b of its own before it.")
        else:
            pairs[-1] = (pairs[-1][0], _numbers(line))
    return Lists(tuple(pairs))


def _rows(lines: Sequence[_Line]) -> Reading:
    columns = _columns(lines[0])
    rows = tuple(_numbers(line) for line in (lines[1:] if columns else lines))
    if not rows:
        raise RequestError("the file has no numbers in it, only the names of columns.")
    if columns is None and all(len(row) == 1 for row in rows):
        return Reading(Flat(tuple(row[0] for row in rows)))
    return Reading(Rows(rows, columns))


def _columns(line: _Line) -> tuple[str, ...] | None:
    """The names in a line that has names for numbers, else None."""
    names = tuple(_unquoted(item.text).lower() for item in line.items)
    if not any(name in NAMES for name in names):
        return None
    for item, name in zip(line.items, names, strict=True):
        if name not in NAMES:
            raise refused(item.place, f'"{one_line(item.text)}" is the name of no column: {listed(COEFFICIENTS)}; - is '
                                      "one that is not read.")
    return names
