"""The tables of a preset as declared structs, and one loop that reads any of them field by field.

Field by field, because every mistake of a file is to be told at once.
"""

from collections.abc import Iterator, Mapping
from math import isfinite
from typing import Annotated, Any, get_args

import msgspec

from streamhost.presets.lines import Path
from streamhost.presets.mistakes import Mistakes

MOST_CHANNELS = 64

CHANGEOVERS = ("keep", "cold", "carry", "warm", "fade", "ramp")
"""How a limit on transients says that a change is made: as the host's, or `keep` with the parameter moved along."""

Text = Annotated[str, msgspec.Meta(description="a text in quotes")]
Number = Annotated[float, msgspec.Meta(description="a number")]
Rate = Annotated[float, msgspec.Meta(description="a number of hertz")]
Rates = Annotated[
    list[float], msgspec.Meta(min_length=1, description="a list of numbers of hertz, for instance [44100, 48000, 96000]")
]
Channels = Annotated[
    list[Annotated[int, msgspec.Meta(ge=1, le=MOST_CHANNELS)]],
    msgspec.Meta(min_length=1, description=f"a list of channels, whole numbers from 1 to {MOST_CHANNELS}, for instance [1]"),
]
Whole = Annotated[int, msgspec.Meta(description="a whole number")]
Truth = Annotated[bool, msgspec.Meta(description="true or false")]
Numbers = Annotated[list[float], msgspec.Meta(description="a list of numbers, for instance [1.0, -0.5]")]
Roots = Annotated[
    list[float | tuple[float, float]],
    # Pairs of conjugates are searched for, which takes the square of their number.
    msgspec.Meta(max_length=1000, description="a list, of at most 1000, of real numbers and pairs [real, imaginary]"),
]
Sections = Annotated[
    list[list[float]] | dict[str, Any],
    msgspec.Meta(description='a list of rows [b0, b1, b2, a0, a1, a2], or { codes = [[...], ...], word = "Q4.12" }'),
]
Rows = Annotated[list[list[int]], msgspec.Meta(description="a list of rows of whole numbers, b0 b1 b2 a0 a1 a2")]
Tables = Annotated[
    list[dict[str, Any]],
    msgspec.Meta(description="one or more tables, each headed [[filter]] in two pairs of brackets"),
]
Table = Annotated[dict[str, Any], msgspec.Meta(description="a table")]
Place = Annotated[
    str | dict[str, Any],
    msgspec.Meta(description='a word, for instance "Q1.15", or a table { word = "Q1.15", rounding = "floor" }'),
]
Length = Annotated[
    int | str | dict[str, Any], msgspec.Meta(description="a number of bits, a text in quotes or a table { bits = 40 }")
]
Widening = Annotated[str, msgspec.Meta(description='"float64", over float32')]


class PresetTable(msgspec.Struct, kw_only=True):
    """The head of a preset."""

    rate: Rate | None = None
    rates: Rates | None = None
    filter: Tables
    title: Text | None = None
    allow_unstable: Truth = False
    structure: Table | None = None
    format: Table | None = None
    limits: Table | None = None


class StructureTable(msgspec.Struct, kw_only=True):
    """[structure]; what is left out is what `realize` takes when it is not told."""

    form: Text = "transposed-2"
    decomposition: Text = "cascade"
    pairing: Text | None = None
    ordering: Text | None = None
    scaling: Text | None = None
    outputs: Text | None = None


class FixedTable(msgspec.Struct, kw_only=True):
    """[format] in fixed point: the arguments of `Fixed`."""

    arithmetic: Text | None = None
    signal: Place | None = None
    input: Place | None = None
    coefficients: Place | None = None
    operand: Place | None = None
    product: Length | None = None
    accumulator: Length | None = None
    state: Place | None = None
    output: Place | None = None
    rounding: Text | None = None
    rounding_place: Text | None = None
    overflow: Text | None = None
    feedback: Text | None = None
    pre_sum: Text | None = None
    dither: Text | None = None
    dither_seed: Whole | None = None
    allow_vanishing: Truth | None = None
    allow_clamping: Truth | None = None


class FloatTable(msgspec.Struct, kw_only=True):
    """[format] in floating point."""

    arithmetic: Text
    accumulator: Widening | None = None
    fused: Truth | None = None
    flush_subnormals: Truth | None = None


class LimitsTable(msgspec.Struct, kw_only=True):
    """[limits]: what the design review asks."""

    band_hz: Numbers | None = None
    noise_dbfs: Number | None = None
    response_deviation_db: Number | None = None
    leak_db: Number | None = None
    headroom_db: Number | None = None
    mask: Text | None = None
    mask_hz: Number | None = None
    limit_cycle_lsb: Number | None = None
    thd_n_db: Number | None = None


    transient_dbfs: Number | None = None
    click_dbfs: Number | None = None
    changeover: Text | None = None
    changeover_ms: Number | None = None
    multiplications: Whole | None = None
    memory_words: Whole | None = None


class EquationTable(msgspec.Struct, kw_only=True):
    """A [[filter]] given as a difference equation."""

    equation: Text


class CoefficientsTable(msgspec.Struct, kw_only=True):
    """A [[filter]] given as b and a."""

    b: Numbers
    a: Numbers | None = None


class SectionsTable(msgspec.Struct, kw_only=True):
    """A [[filter]] given as sections."""

    sections: Sections


class CodesTable(msgspec.Struct, kw_only=True):
    """Sections given as codes."""

    codes: Rows
    word: Text


class RootsTable(msgspec.Struct, kw_only=True):
    """A [[filter]] given as zeros, poles and factor."""

    zeros: Roots
    poles: Roots
    factor: Number


def names(struct: type[msgspec.Struct]) -> tuple[str, ...]:
    """The keys of a table."""
    return tuple(field.name for field in msgspec.structs.fields(struct))


def read_table(
    mistakes: Mistakes, table: Mapping[str, Any], path: Path, struct: type[msgspec.Struct]
) -> dict[str, Any]:
    """The fields of `table` that are as declared; all others are mistakes. What is left out is left out."""
    known = {field.name: field for field in msgspec.structs.fields(struct)}
    for key in table:
        if key not in known:
            mistakes.unknown((*path, key), known)
    for key, field in known.items():
        if field.required and key not in table:
            mistakes.add(path, f"{key} is missing: {description(field.type)}.")
    return {
        key: value for key, field in known.items()
        if key in table and (value := read_value(mistakes, table[key], (*path, key), field.type)) is not None
    }


def read_whole(
    mistakes: Mistakes, table: Mapping[str, Any], path: Path, struct: type[msgspec.Struct]
) -> dict[str, Any] | None:
    """As `read_table`, but None after any mistake."""
    before = len(mistakes.found)
    values = read_table(mistakes, table, path, struct)
    return values if len(mistakes.found) == before else None


def read_value(mistakes: Mistakes, value: object, path: Path, declared: object) -> Any:
    """The value as declared, or None after a mistake."""
    try:
        converted = msgspec.convert(value, type=declared, strict=True)
    except msgspec.ValidationError as error:
        inside = _inside(str(error))
        rule = f"is not allowed: {key_of(path)} is {description(declared)}."
        mistakes.value((*path, *inside), _at(value, inside), rule)
        return None
    infinite = next(_infinite(converted, ()), None)
    if infinite is not None:
        mistakes.value((*path, *infinite), _at(value, infinite), "is not a finite number.")
        return None
    return converted


def key_of(path: Path) -> str:
    """The last key of a path that is no index."""
    return str([part for part in path if isinstance(part, str)][-1])


def description(declared: object) -> str:
    """What a type allows, in words."""
    for meta in get_args(declared):
        if isinstance(meta, msgspec.Meta) and meta.description:
            return meta.description
        if words := description(meta) if get_args(meta) else "":
            return words
    return ""


def _inside(message: str) -> Path:
    """The place inside a value that msgspec names at the end of a message: '... - at `$[2][0]`'."""
    place = message.rpartition("`$")[2].rstrip("`") if "`$" in message else ""
    parts = place.replace("]", "").split("[")[1:]
    return tuple(int(part) for part in parts) if all(part.isdecimal() for part in parts) else ()


def _at(value: Any, inside: Path) -> object:
    for part in inside:
        value = value[part]
    return value


def _infinite(value: object, place: Path) -> Iterator[Path]:
    """The places inside a list at which a number is infinite or none; tables have their own reading."""
    if isinstance(value, float) and not isfinite(value):
        yield place
    elif isinstance(value, list | tuple):
        for index, entry in enumerate(value):
            yield from _infinite(entry, (*place, index))
