"""Families of presets: some keys varied, every value with every other."""

import copy
import tomllib
from collections.abc import Iterable, Sequence
from dataclasses import replace
from itertools import product
from typing import Any

from streamhost.errors import PresetError
from streamhost.presets.lines import split_at_commas
from streamhost.presets.mistakes import one_line, value_text
from streamhost.presets.preset import Preset
from streamhost.presets.reading import read_preset
from streamhost.structures import forms

MOST_VARIANTS = 1000
ONE_OF = {"rate": "rates", "rates": "rate"}
"""Keys of the head of which one stands in the place of the other."""

ALL_FORMS = ("structure.form", "all")
"""A key and the value that stands for every form there is, of which those are kept that carry the filter."""

EXAMPLE = "structure.form=direct-1,transposed-2"

Variation = tuple[str, tuple[str, ...]]
Choice = tuple[str, str, str]
"""A key, the text of its value, and how a title shows it."""


def vary(presets: Iterable[Preset], variations: Sequence[str]) -> list[Preset]:
    """Every preset with every combination of the varied values, for instance "structure.form=direct-1,transposed-2".

    A key is written as in the file, with its table: format.signal, filter.q, or filter.2.q where there are several
    filters. A value is TOML where it can be read as such, else a text. It replaces what the preset states for that key
    and nothing else. "structure.form=all" is every form, and its presets are marked as sought. Raises PresetError with the
    mistakes of the first variant that has some.
    """
    read = [_variation(text) for text in variations]
    keys = [key for key, _ in read]
    for key in keys:
        if keys.count(key) > 1:
            raise PresetError([f"--vary {key} is given twice: join its values by commas, for instance {EXAMPLE}."])
    presets = list(presets)
    combinations = list(product(*(_choices(*variation) for variation in read))) if _count(presets, read) else []
    family = [_varied(preset, chosen) for preset in presets for chosen in combinations]
    if not any(_asks_for_all(*_parts(text)) for text in variations):
        return family
    return [replace(one, source=replace(one.source, sought=True)) for one in family]


def _asks_for_all(key: str, values: Sequence[str]) -> bool:
    return key == ALL_FORMS[0] and ALL_FORMS[1] in values


def _variation(text: str) -> Variation:
    key, values = _parts(text)
    if "=" not in text or not all(key.split(".")) or not all(values):
        raise PresetError([f"--vary {text} is not KEY=VALUE,VALUE, for instance {EXAMPLE}."])
    return key, forms() if _asks_for_all(key, values) else values


def _parts(text: str) -> Variation:
    key, _, values = text.partition("=")
    return key.strip(), tuple(value.strip() for value in split_at_commas(values))


def _count(presets: Sequence[Preset], variations: Sequence[Variation]) -> int:
    count = len(presets)
    for _, values in variations:
        count *= len(values)
    if count > MOST_VARIANTS:
        raise PresetError([f"--vary asks for {count} realizations, and at most {MOST_VARIANTS} are made at once."])
    return count


def _choices(key: str, texts: Sequence[str]) -> list[Choice]:
    """The values of one key; those that look alike when shown shortened are numbered."""
    values = [_value(text) for text in texts]
    shown = [one_line(value) if isinstance(value, str) else f"{key.rpartition('.')[2]} {value_text(value)}" for value in values]
    numbered = [f"{one} ({number})" if shown.count(one) > 1 else one for number, one in enumerate(shown, 1)]
    return list(zip([key] * len(texts), texts, numbered, strict=True))


def _varied(preset: Preset, chosen: Sequence[Choice]) -> Preset:
    if not chosen:
        return preset
    table = copy.deepcopy(dict(preset.source.table))
    for key, text, _ in chosen:
        _put(table, key, _value(text), preset.source.name)
    source = replace(preset.source, table=table, varied=(*preset.source.varied, *(shown for _, _, shown in chosen)))
    try:
        return read_preset(source, preset.path)
    except PresetError as error:
        asked = " ".join(f"--vary {key}={text}" for key, text, _ in chosen)
        raise PresetError(f"{problem} (Asked for by {asked})" for problem in error.problems) from None


def _put(table: dict[str, Any], key: str, value: object, name: str) -> None:
    """Sets a dotted key in a raw table; tables on the way that are not there are made."""
    *way, last = key.split(".")
    inside: Any = table
    for part in way:
        inside = _member(inside, part)
    if isinstance(inside, list) and len(inside) == 1:
        inside = inside[0]
    if not isinstance(inside, dict):
        count = len(table["filter"]) if isinstance(table.get("filter"), list) else 0
        which = f" It has {count} filters: say which, for instance filter.1.{last}." if way == ["filter"] else ""
        raise PresetError([f"--vary {key}: {name} has no table of that name.{which}"])
    inside[last] = value
    if inside is table and last in ONE_OF:
        inside.pop(ONE_OF[last], None)


def _member(inside: Any, part: str) -> Any:
    """The table `part` of a table, or the table of that number (from 1) in a list; None where there is none."""
    if isinstance(inside, list) and part.isdecimal():
        return inside[int(part) - 1] if 1 <= int(part) <= len(inside) else None
    if isinstance(inside, list) and len(inside) == 1:
        inside = inside[0]
    return inside.setdefault(part, {}) if isinstance(inside, dict) else None


def _value(text: str) -> object:
    try:
        table = tomllib.loads(f"value = {text}")
    except (ValueError, RecursionError):
        return text
    value = table["value"]
    return value if table.keys() == {"value"} and isinstance(value, str | bool | int | float | list | dict) else text
