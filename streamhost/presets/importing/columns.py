"""What stands in which column of a row, and what a list is of which the file does not say it."""

from streamhost.errors import RequestError, nearest
from streamhost.presets.importing.stated import Flat, Lists, Number, Numbers, Rows, Section, Sections, refused
from streamhost.presets.mistakes import listed, one_line

COEFFICIENTS = ("b0", "b1", "b2", "a0", "a1", "a2")
NOT_READ = "-"
NAMES = (*COEFFICIENTS, NOT_READ)
TAPS = ("b",)
USUAL = {6: COEFFICIENTS, 5: ("b0", "b1", "b2", "a1", "a2")}

Columns = tuple[str, ...]


def parse_columns(text: str) -> Columns:
    """The columns that are asked for; RequestError unless each coefficient but a0 has exactly one."""
    columns = tuple(name.strip().lower() for name in text.split(","))
    if columns != TAPS:
        _check(columns, f"--columns {one_line(text)}")
    return columns


def _check(columns: Columns, what: str) -> None:
    for name in columns:
        if name not in NAMES:
            raise RequestError(f'{what}: "{one_line(name)}" is no column: {listed(NAMES)}.{nearest(name, COEFFICIENTS)}')
        if name != NOT_READ and columns.count(name) > 1:
            raise RequestError(f"{what}: {name} is named {columns.count(name)} times.")
    missing = [name for name in COEFFICIENTS if name != "a0" and name not in columns]
    if missing:
        raise RequestError(f"{what}: no column is {listed(missing)}. A section has b0, b1, b2, a1 and a2, and a0 or not.")


def arranged(stated: Rows | Flat | Lists, asked: Columns | None, one: int) -> tuple[Sections, tuple[str, ...]]:
    """The sections, and notes of what was decided. `one` is what 1 is written as in a column of a0.

    RequestError where the file does not say what its numbers are and the user does not either.
    """
    if isinstance(stated, Lists):
        if asked is not None:
            raise RequestError(f"--columns {','.join(asked)}: the file has lists of b and of a, and no columns. Leave it out.")
        return _of_lists(stated, one)
    if asked == TAPS:
        return _taps(stated)
    if isinstance(stated, Flat):
        stated = _cut(stated, asked)
    columns, why = _chosen(stated, asked, one)
    sections = tuple(_section(row, columns) for row in stated.rows)
    return sections, (f"columns: {','.join(columns)}, {why}", *_note_on_a0(sections, one))


def _of_lists(stated: Lists, one: int) -> tuple[Sections, tuple[str, ...]]:
    sections = tuple(Section(b, a[0] if a else None, a[1:]) for b, a in stated.pairs)
    return sections, _note_on_division(sections, one)


def _taps(stated: Rows | Flat) -> tuple[Sections, tuple[str, ...]]:
    if isinstance(stated, Rows):
        if len(stated.rows) > 1:
            raise refused(stated.rows[1][0].place, "--columns b takes one list, and this is a second row of numbers.")
        stated = Flat(stated.rows[0])
    return (Section(stated.numbers, None, ()),), ("columns: b, the coefficients of a finite response, as asked",)


def _cut(stated: Flat, asked: Columns | None) -> Rows:
    """A list cut into rows, which takes that the columns are stated."""
    count = len(stated.numbers)
    if asked is None:
        raise RequestError(
            f"the file has one list, of length {count}, and does not say of what. State --columns "
            f"{','.join(COEFFICIENTS)} (in its order, without a0 where it is left out) for sections one after the other, or "
            "--columns b for the coefficients of a finite response."
        )
    if count % len(asked):
        raise RequestError(f"the file has one list, of length {count}, which is no multiple of the {len(asked)} columns "
                           f"{','.join(asked)}.")
    return Rows(tuple(stated.numbers[i : i + len(asked)] for i in range(0, count, len(asked))))


def _chosen(stated: Rows, asked: Columns | None, one: int) -> tuple[Columns, str]:
    """The columns and why it is these."""
    if stated.columns is not None:
        _check(stated.columns, "the line of column names")
        if asked not in (None, stated.columns):
            raise RequestError(f"--columns {','.join(asked or ())}: the file names its columns otherwise, "
                               f"{','.join(stated.columns)}. Leave --columns out, or the line of names.")
    columns = stated.columns or asked or USUAL.get(len(stated.rows[0]))
    if columns is None:
        raise refused(stated.rows[0][0].place, f"this row has length {len(stated.rows[0])}; a section is a row of six, "
                      f"{','.join(COEFFICIENTS)}, or of five without a0. State --columns for any other.")
    for row in stated.rows:
        if len(row) != len(columns):
            raise refused(row[0].place, f"this row has length {len(row)}, not {len(columns)}, the number of the columns "
                                        f"{','.join(columns)}.")
    if stated.columns is not None:
        return columns, "as the file names them"
    if asked is not None:
        return columns, "as asked"
    _check_usual(stated.rows, one)
    return columns, "the usual order, since the file names none (--columns states another)"


def _check_usual(rows: tuple[Numbers, ...], one: int) -> None:
    """Refuses the usual order where a0 is not 1, but another column is 1 throughout."""
    place = COEFFICIENTS.index("a0")
    if len(rows[0]) != len(COEFFICIENTS) or all(row[place].value == one for row in rows):
        return
    for column in range(len(COEFFICIENTS)):
        if all(row[column].value == one for row in rows):
            raise RequestError(
                f"the columns may stand in another order than {','.join(COEFFICIENTS)}: column {column + 1} is {one} in every "
                f"row, as a0 mostly is, and column {place + 1} is not. State the order with --columns."
            )


def _section(row: Numbers, columns: Columns) -> Section:
    by_name: dict[str, Number] = dict(zip(columns, row, strict=True))
    b = tuple(by_name[name] for name in ("b0", "b1", "b2"))
    return Section(b, by_name.get("a0"), tuple(by_name[name] for name in ("a1", "a2")))


def _note_on_a0(sections: Sections, one: int) -> tuple[str, ...]:
    if all(section.a0 is None for section in sections):
        return ("a0: not in the file, taken as 1",)
    return _note_on_division(sections, one)


def _note_on_division(sections: Sections, one: int) -> tuple[str, ...]:
    divided = [section.a0 for section in sections if section.a0 and section.a0.value not in (0, one)]
    return (f"a0: divided out, {divided[0].value} at {divided[0].place}{_more(len(divided) - 1)}",) if divided else ()


def _more(count: int) -> str:
    return f" and not 1 in {count} more" if count else ""
