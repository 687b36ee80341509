"""The values of the coefficients as a table: one row a section, or, of one section alone, one row a power of z^-1."""

import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from math import ceil

from streamhost.diagram import Diagram
from streamhost.drawing.text import MINUS, Label, Run, coefficient

NAME = re.compile(r"(-?[A-Za-z]+)(\d*)(?:_([a-z][a-z0-9]*))?(?:_(\d+))?")
DECIMALS = 6
MOST_COLUMNS = 7
SMALLEST = 1e-4
ROWS_A_BLOCK = 10


@dataclass(frozen=True)
class Table:
    """Heads and rows; every cell is set to the right."""

    heads: tuple[Label, ...]
    rows: tuple[tuple[Label, ...], ...]


@dataclass(frozen=True)
class Entry:
    """One coefficient: its name without the section, the section, the channel it is for (None: all), its value.

    `row` is what the section is called: its number, and, where it leads to one of several outputs, that output's name.
    """

    label: str
    letters: str
    number: str
    section: int | None
    channel: int | None
    value: float
    row: str = ""


Key = Callable[[Entry], str]


def value_table(diagram: Diagram) -> Table | None:
    """The coefficients' values; channels have rows of their own where they differ. None without coefficients."""
    entries = entries_of(diagram)
    if not entries:
        return None
    sections = {entry.section for entry in entries}
    names = {entry.letters + entry.number for entry in entries}
    if None not in sections and len(names) <= MOST_COLUMNS:
        what = "section" if len(sections) > 1 else ""
        table = grid(entries, what, lambda e: e.row, lambda e: e.letters + e.number, lambda e: e.section or 0)
    elif sections in ({0}, {None}) and all(entry.number for entry in entries):
        table = grid(entries, "k", lambda e: e.number, lambda e: e.letters, lambda e: int(e.number))
    else:
        table = None
    return in_blocks(table or listed(entries))


def in_blocks(table: Table) -> Table:
    """A long narrow table broken into blocks side by side."""
    most = max(1, MOST_COLUMNS // len(table.heads))
    blocks = min(most, ceil(len(table.rows) / ROWS_A_BLOCK))
    high = ceil(len(table.rows) / blocks)
    empty: tuple[Label, ...] = ((),) * len(table.heads)
    padded = [*table.rows, *[empty] * (high * blocks - len(table.rows))]
    rows = [tuple(cell for block in range(blocks) for cell in padded[block * high + i]) for i in range(high)]
    return Table(table.heads * blocks, tuple(rows))


def entries_of(diagram: Diagram) -> list[Entry]:
    differ = bool((diagram.values != diagram.values[:, :1]).any())
    names = output_rows(diagram)
    found: list[Entry] = []
    for slot, values in zip(diagram.slots, diagram.values.tolist(), strict=True):
        parts = NAME.fullmatch(slot.label)
        letters, number = (parts[1], parts[2]) if parts else (slot.label, "")
        row = names.get(slot.section, str((slot.section or 0) + 1))
        for channel, value in enumerate(values if differ else values[:1]):
            found.append(Entry(slot.label, letters, number, slot.section, channel if differ else None, value, row))
    return found


def output_rows(diagram: Diagram) -> dict[int | None, str]:
    """What the sections are called that lead to one of several outputs: by its name, and their number there."""
    named = [(slot.section, NAME.fullmatch(slot.label)) for slot in diagram.slots]
    rows = [(section, f"{parts[3]} {parts[4] or ''}".rstrip()) for section, parts in named if parts and parts[3]]
    # the gain in front of a section has its name and not its number
    return dict(sorted(rows, key=lambda row: len(row[1])))


def grid(entries: Sequence[Entry], what: str, row: Key, column: Key, rank: Callable[[Entry], int]) -> Table | None:
    """Rows and columns by two keys, rows in the order of `rank`; None where two coefficients would share a cell."""
    cells: dict[tuple[str, int | None, str], float] = {}
    ranks: dict[str, int] = {}
    for entry in entries:
        ranks.setdefault(row(entry), rank(entry))
        place = (row(entry), entry.channel, column(entry))
        if place in cells:
            return None
        cells[place] = entry.value
    columns = list(dict.fromkeys(column for _, _, column in sorted(cells, key=lambda place: by_letter(place[2]))))
    rows = sorted({(row, channel) for row, channel, _ in cells}, key=lambda key: (ranks[key[0]], key[1] or 0))
    scales = {name: is_small([value for (_, _, c), value in cells.items() if c == name]) for name in columns}
    lines = [(*head(row if what else "", channel), *(number(cells.get((row, channel, name)), scales[name]) for name in columns))
             for row, channel in rows]
    return Table((*heads(what, entries), *map(coefficient, columns)), tuple(lines))


def by_letter(name: str) -> tuple[int, str, int]:
    """b before a, then by number; others first."""
    letters = name.lstrip("-").rstrip("0123456789")
    rank = {"b": 1, "a": 2}.get(letters, 0)
    return rank, letters, int(name.lstrip("-")[len(letters):] or 0)


def listed(entries: Sequence[Entry]) -> Table:
    """A name and a value a row; what is named and valued alike is listed once."""
    small = is_small([entry.value for entry in entries])
    rows = [(coefficient(e.label), *head("", e.channel), number(e.value, small)) for e in entries]
    return Table((*heads("coefficient", entries), (Run("value", italic=True),)), tuple(dict.fromkeys(rows)))


def heads(what: str, entries: Sequence[Entry]) -> list[Label]:
    named = [what] if what else []
    return [(Run(name, italic=True),) for name in (named if entries[0].channel is None else [*named, "channel"])]


def head(row: str, channel: int | None) -> tuple[Label, ...]:
    return tuple((Run(name),) for name in (row, "" if channel is None else str(channel + 1)) if name)


def is_small(values: Sequence[float]) -> bool:
    """Whether six decimals would hide one of the values."""
    return any(0 < abs(value) < SMALLEST for value in values)


def number(value: float | None, small: bool) -> Label:
    if value is None:
        return ()
    return (Run(f"{value:.{DECIMALS}{'e' if small else 'f'}}".replace("-", MINUS)),)
