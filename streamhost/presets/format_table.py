"""[format] of a preset: fixed point, or floating point, never a mixture."""

from collections.abc import Iterable, Mapping
from dataclasses import replace
from typing import Any

from streamhost.errors import FormatError, nearest
from streamhost.formats import ARITHMETICS, FLOATS, Fixed, Format
from streamhost.presets.lines import Path
from streamhost.presets.mistakes import Mistakes, listed
from streamhost.presets.tables import FixedTable, FloatTable, names, read_table

PATH: Path = ("format",)

# Where the signal's word is itself a mistake, the other keys are still checked, against this one.
STAND_IN = "Q1.15"


def read_format(mistakes: Mistakes, table: Mapping[str, Any]) -> Format | None:
    """The format that the table states, or None after a mistake; an empty table is float64."""
    if not table:
        return FLOATS["float64"]
    arithmetic = table.get("arithmetic")
    if isinstance(arithmetic, str) and arithmetic in FLOATS:
        return _float(mistakes, arithmetic, table)
    return _fixed(mistakes, table)


def _float(mistakes: Mistakes, arithmetic: str, table: Mapping[str, Any]) -> Format | None:
    foreign = _without(table, names(FixedTable), names(FloatTable))
    for key in foreign:
        mistakes.value(
            (*PATH, key), table[key],
            f"belongs to fixed point, and {arithmetic} stands at all eight places of a format at once: "
            "leave one of the two out.",
        )
    own = {key: value for key, value in table.items() if key not in foreign}
    given = read_table(mistakes, own, PATH, FloatTable)
    given.pop("arithmetic", None)
    try:
        return replace(FLOATS[arithmetic], **given)
    except FormatError as error:
        mistakes.add((*PATH, "accumulator"), str(error))
        return None


def _fixed(mistakes: Mistakes, table: Mapping[str, Any]) -> Format | None:
    refused = [*_without(table, names(FloatTable), names(FixedTable)),
               *(key for key, value in table.items() if isinstance(value, str) and value in FLOATS)]
    for key in refused:
        mistakes.value(
            (*PATH, key), table[key],
            "belongs to floating point, which stands at all eight places of a format at once: "
            'state arithmetic = "float32" and no word, or leave it out.',
        )
    arithmetic = table.get("arithmetic")
    if isinstance(arithmetic, str) and arithmetic not in ARITHMETICS:
        every = (*ARITHMETICS, *FLOATS)
        mistakes.value((*PATH, "arithmetic"), arithmetic, f"is not known: {listed(every)}.{nearest(arithmetic, every)}")
        refused.append("arithmetic")
    values = read_table(mistakes, {key: value for key, value in table.items() if key not in refused}, PATH, FixedTable)
    if len(values) < len(table):
        values.setdefault("signal", STAND_IN)
    return _built(mistakes, values)


def _built(mistakes: Mistakes, stated: Mapping[str, Any]) -> Fixed | None:
    """The format; `Fixed` stops after each of its stages, so what it refuses is taken out and the rest tried again."""
    values, tried = dict(stated), None
    while values != tried:
        tried = dict(values)
        try:
            return Fixed(**values)
        except FormatError as error:
            for key, message in error.problems:
                _tell(mistakes, stated, key, message)
                root = key.partition(".")[0]
                values.pop(root, None)
                if root == "signal":
                    values[root] = STAND_IN
    return None


def _tell(mistakes: Mistakes, stated: Mapping[str, Any], key: str, message: str) -> None:
    parts = key.split(".")
    value: Any = stated
    for part in parts:
        value = value.get(part) if isinstance(value, Mapping) else None
    rest = message.removeprefix(f"= {value!r} ")
    if rest != message:
        mistakes.value((*PATH, *parts), value, rest)
    else:
        mistakes.add((*PATH, *parts), f"{key} {message}")


def _without(table: Mapping[str, Any], keys: Iterable[str], but: Iterable[str]) -> list[str]:
    return [key for key in table if key in keys and key not in but]
