"""The [[filter]] tables: the ways in which a preset may state a filter, and for which rates and channels."""

import re
from collections.abc import Callable, Mapping, Sequence
from typing import Any

from streamhost.errors import FilterError, nearest
from streamhost.filters import Filter, kinds
from streamhost.filters.designs import KINDS, design
from streamhost.presets.bands import Band, Bands, filter_of, highest_channel
from streamhost.presets.lines import Path
from streamhost.presets.mistakes import Mistakes, listed, one_line
from streamhost.presets.positions import check_positions
from streamhost.presets.tables import (
    Channels,
    CodesTable,
    CoefficientsTable,
    EquationTable,
    RootsTable,
    SectionsTable,
    Text,
    read_value,
    read_whole,
)

Table = Mapping[str, Any]


def read_filters(mistakes: Mistakes, tables: list[dict[str, Any]], rates: Sequence[float]) -> dict[float, Bands] | None:
    """All [[filter]] tables designed at each rate, or None after a mistake. No rates: they are themselves a mistake.

    What is wrong at some of several rates only is told with the rate.
    """
    if not tables:
        mistakes.add(("filter",), "filter = [] states no filter: at least one table [[filter]] is needed.")
    before = len(mistakes.found)
    if len(rates) > 1:
        _check_kinds(mistakes, tables, len(rates))
    designs, found = {}, {}
    for rate in rates or (None,):
        own = Mistakes(mistakes.name, mistakes.lines)
        designs[rate or 0.0] = _read_bands(own, tables, rate)
        found[rate] = own.found
    everywhere = [each for each in next(iter(found.values())) if all(each in others for others in found.values())]
    mistakes.found += everywhere
    for rate, own_found in found.items():
        mistakes.found += [(line, f"{text} (At {rate:g} Hz.)") for line, text in own_found if (line, text) not in everywhere]
    good = rates and tables and len(mistakes.found) == before
    return designs if good else None


def _check_kinds(mistakes: Mistakes, tables: list[dict[str, Any]], rates: int) -> None:
    """Of several rates every filter is designed at each, which a kind can and numbers cannot."""
    for index, table in enumerate(tables):
        way = next((way for way, (keys, _) in WAYS.items() if way != "kind" and any(key in table for key in keys)), None)
        if way is not None and "kind" not in table:
            mistakes.add(("filter", index), f"this [[filter]] is stated by {way}: numbers belong to one rate, and the preset "
                                            f"has {rates} rates. State a kind, which is designed at each, or one rate.")


def _read_bands(mistakes: Mistakes, tables: list[dict[str, Any]], rate: float | None) -> Bands:
    bands = [_read_band(mistakes, table, ("filter", index), rate) for index, table in enumerate(tables)]
    good = tuple(band for band in bands if band is not None)
    if rate is None or not good or len(good) < len(bands) or mistakes.found:
        return good
    try:
        outputs = {filter_of(good, channel).outputs for channel in range(1, max(1, highest_channel(good)) + 1)}
        if len(outputs) > 1:
            raise FilterError("the filters of the channels have different outputs; all channels have the same.")
    except FilterError as error:
        mistakes.add(("filter",), str(error))
    return good


def _read_band(mistakes: Mistakes, table: Table, path: Path, rate: float | None) -> Band | None:
    channels = read_value(mistakes, table["channels"], (*path, "channels"), Channels) if "channels" in table else ()
    if channels is not None and len(set(channels)) < len(channels):
        mistakes.value((*path, "channels"), channels, "is not allowed: a channel is named once.")
    own = {key: value for key, value in table.items() if key not in ("channels", "positions")}
    filter = _read_filter(mistakes, own, path, rate)
    if "positions" in table:
        check_positions(mistakes, table, path, rate)
    return Band(filter, tuple(channels)) if filter is not None and channels is not None else None


def _read_filter(mistakes: Mistakes, table: Table, path: Path, rate: float | None) -> Filter | None:
    stated = [way for way, (keys, _) in WAYS.items() if any(key in table for key in keys)]
    if len(stated) == 1:
        return WAYS[stated[0]][1](mistakes, table, path, rate)
    if stated:
        mistakes.add(path, f"this [[filter]] states {len(stated)} filters, by {' and by '.join(stated)}: "
                           "one [[filter]] table for each, and they stand in cascade.")
        return None
    mistakes.add(path, f"this [[filter]] states no filter: by {listed(WAYS)}.")
    every = {key for keys, _ in WAYS.values() for key in keys}
    for key in table:
        if hint := nearest(key, every):
            mistakes.add((*path, key), f"{one_line(key)} is not known.{hint}")
    return None


def _by_kind(mistakes: Mistakes, table: Table, path: Path, rate: float | None) -> Filter | None:
    kind = read_value(mistakes, table["kind"], (*path, "kind"), Text)
    if kind is None:
        return None
    if kind not in KINDS:
        mistakes.value((*path, "kind"), kind, f"is not known: {listed(kinds())}.{nearest(kind, kinds())}")
        return None
    given = {key: value for key, value in table.items() if key != "kind"}
    if not _parameters_good(mistakes, kind, given, path, rate) or rate is None:
        return None
    return _made(mistakes, path, lambda: design(kind, rate=rate, **given))


def _parameters_good(mistakes: Mistakes, kind: str, given: Table, path: Path, rate: float | None) -> bool:
    """Whether every parameter is in its declared range; each that is not is told at its own line."""
    spec = KINDS[kind]
    parameters = {parameter.name: parameter for parameter in spec.parameters}
    before = len(mistakes.found)
    for key, value in given.items():
        if key not in parameters:
            mistakes.add((*path, key), f'{one_line(key)} is no parameter of "{kind}", which takes {listed(parameters)}.'
                                       f"{nearest(key, parameters)}")
        elif parameters[key].range.taken(value, rate) is None:
            mistakes.value((*path, key), value, f"is not allowed: {parameters[key].range.allowed(rate)}.")
    for key, parameter in parameters.items():
        if key not in given and key not in spec.alternatives and parameter.default is None:
            mistakes.add(path, f'{key} is missing: "{kind}" needs it, {parameter.range.allowed(rate)}.')
    chosen = [key for key in spec.alternatives if key in given]
    if spec.alternatives and len(chosen) != 1:
        mistakes.add(path, f'"{kind}" needs exactly one of {" and ".join(spec.alternatives)}, '
                           f"and {'both are' if chosen else 'neither is'} given.")
    return len(mistakes.found) == before


def _by_equation(mistakes: Mistakes, table: Table, path: Path, rate: float | None) -> Filter | None:
    values = read_whole(mistakes, table, path, EquationTable)
    if values is None:
        return None
    return _made(mistakes, path, lambda: Filter.from_equation(values["equation"], rate=rate or 1.0))


def _by_coefficients(mistakes: Mistakes, table: Table, path: Path, rate: float | None) -> Filter | None:
    values = read_whole(mistakes, table, path, CoefficientsTable)
    if values is None:
        return None
    b, a = values["b"], values.get("a", (1.0,))
    return _made(mistakes, path, lambda: Filter.from_coefficients(b, a, rate=rate or 1.0))


def _by_sections(mistakes: Mistakes, table: Table, path: Path, rate: float | None) -> Filter | None:
    values = read_whole(mistakes, table, path, SectionsTable)
    if values is None:
        return None
    sections = values["sections"]
    if not isinstance(sections, dict):
        return _made(mistakes, path, lambda: Filter.from_sections(sections, rate=rate or 1.0))
    inside = (*path, "sections")
    coded = read_whole(mistakes, sections, inside, CodesTable)
    if coded is None:
        return None
    codes, word = coded["codes"], coded["word"]
    return _made(mistakes, inside, lambda: Filter.from_codes(codes, word, rate=rate or 1.0))


def _by_roots(mistakes: Mistakes, table: Table, path: Path, rate: float | None) -> Filter | None:
    values = read_whole(mistakes, table, path, RootsTable)
    if values is None:
        return None
    zeros, poles, factor = _complex(values["zeros"]), _complex(values["poles"]), values["factor"]
    return _made(mistakes, path, lambda: Filter.from_zeros_poles(zeros, poles, factor, rate=rate or 1.0))


def _complex(roots: list[float | tuple[float, float]]) -> list[complex]:
    return [complex(*root) if isinstance(root, tuple) else complex(root) for root in roots]


def _made(mistakes: Mistakes, path: Path, make: Callable[[], Filter]) -> Filter | None:
    """The filter, or None with the filter's own refusal put on the line of the key or element that it begins with.

    Below the first line of a refusal stands only what marks the place in an equation, and a preset tells one line.
    """
    try:
        return make()
    except FilterError as error:
        text = str(error).partition("\n")[0]
        named = re.match(r"(?:a0 of )?(b|a|sections|codes|word|zeros|poles|factor|equation)((?:\[\d+\])*)", text)
        inside: Path = (named[1], *map(int, re.findall(r"\d+", named[2]))) if named else ()
        mistakes.add((*path, *inside), text)
        return None


WAYS: Mapping[str, tuple[tuple[str, ...], Callable[[Mistakes, Table, Path, float | None], Filter | None]]] = {
    "kind": (("kind",), _by_kind),
    "equation": (("equation",), _by_equation),
    "b and a": (("b", "a"), _by_coefficients),
    "sections": (("sections",), _by_sections),
    "zeros, poles and factor": (("zeros", "poles", "factor"), _by_roots),
}
