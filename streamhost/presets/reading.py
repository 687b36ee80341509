"""From a preset's text to a Preset; every mistake of the file is told at once."""

import re
import tomllib
from collections.abc import Mapping
from pathlib import Path
from types import MappingProxyType
from typing import Any

from streamhost.errors import MachineError, PresetError, nearest
from streamhost.filters.curves.masks import MASKS, mid_bands_text
from streamhost.presets.filter_table import read_filters
from streamhost.presets.format_table import read_format
from streamhost.presets.lines import scan
from streamhost.presets.mistakes import Mistakes, listed
from streamhost.presets.preset import Preset, Source
from streamhost.presets.tables import CHANGEOVERS, LimitsTable, PresetTable, StructureTable, read_table
from streamhost.shipped import names, resolve

LARGEST_BYTES = 1_000_000
UNNAMED = "preset"

_IN_OUR_WORDS = (
    ("Cannot overwrite a value", "a key is stated twice"),
    ("Cannot declare", "a table is headed twice"),
    ("Invalid value", "what stands here is no value; texts stand in quotes, a point stands between two digits"),
    ("Expected '=' after a key", "a key is followed by = and its value"),
    ("Invalid statement", "a line is key = value, or a table's head in brackets"),
    ("Expected newline or end of document", "something follows where the line should end"),
    ("Unterminated string", "a text is not closed by its quote"),
    ("Unclosed array", "a list is not closed by ]"),
    ("Unclosed inline table", "a table is not closed by }"),
)


def load_preset(path: str | Path, *, name: str | None = None) -> Preset:
    """The preset in a file of at most 1 MB, or the shipped one of that name. `name` is what messages call it.

    Raises PresetError with every mistake of the file, MachineError where the file cannot be read.
    """
    path = Path(path)
    name = name or str(path)
    if path.as_posix() in names("preset") and not path.exists():
        path = resolve(path, "preset")
    content = _content(path)
    if len(content) > LARGEST_BYTES:
        raise PresetError([f"{name}: the file is larger than 1 MB, which no preset is."])
    try:
        text = content.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = content.count(b"\n", 0, error.start) + 1
        byte = f"0x{content[error.start]:02X}"
        raise PresetError([f"{name}:{line}: the file is no text in UTF-8: the byte {byte} is none."]) from None
    return _parsed(text, name, path)


def parse_preset(text: str, path: Path | None = None) -> Preset:
    """The preset that a text states; raises PresetError with all its mistakes. `path` only names the text."""
    return _parsed(text, str(path) if path else UNNAMED, path)


def _parsed(text: str, name: str, path: Path | None) -> Preset:
    if not text.strip():
        raise PresetError([f"{name}: the preset is empty: it states at least rate and one [[filter]]."])
    lines = scan(text)
    if lines.too_deep:
        raise PresetError([f"{name}:{lines.too_deep[0]}: a preset has no place for {lines.too_deep[1]}"])
    return read_preset(Source(name, toml_table(text, name), lines), path)


def read_preset(source: Source, path: Path | None) -> Preset:
    """The preset that a raw table states; raises PresetError with all its mistakes."""
    mistakes = Mistakes(source.name, source.lines)
    head = read_table(mistakes, source.table, (), PresetTable)
    rates = _rates(mistakes, source.table, head)
    designs = read_filters(mistakes, head["filter"], rates) if "filter" in head else None
    structure = _structure(mistakes, head.get("structure", {}))
    arithmetic = read_format(mistakes, head.get("format", {}))
    limits = _limits(mistakes, head.get("limits", {}), min(rates, default=None))
    title = _title(mistakes, head.get("title"), path)
    mistakes.raise_any()
    assert designs is not None and arithmetic is not None
    return Preset(
        title=", ".join([title, *source.varied]), path=path, rate=rates[0], designs=MappingProxyType(designs),
        **structure, format=arithmetic, limits=MappingProxyType(limits), source=source,
        allow_unstable=head.get("allow_unstable", False),
    )


def _content(path: Path) -> bytes:
    try:
        with path.open("rb") as file:
            return file.read(LARGEST_BYTES + 1)
    except FileNotFoundError:
        raise PresetError([f"{path}: there is no such file.{_nearest_file(path)}"]) from None
    except (IsADirectoryError, NotADirectoryError):
        what = "is a folder" if path.is_dir() else "lies inside a file"
        raise PresetError([f"{path}: this {what}, and a preset is a file.{_files_in(path)}"]) from None
    except ValueError:
        raise PresetError([f"{str(path)!r}: no file has such a name."]) from None
    except OSError as error:
        raise MachineError(f"{path}: the preset cannot be read: {error.strerror}.") from error


def _nearest_file(path: Path) -> str:
    from streamhost.shipped import names

    beside = [file.name for file in path.parent.glob("*.toml")] if path.parent.is_dir() else []
    shipped = names("preset")
    hint = nearest(path.name, beside) or nearest(path.stem, shipped)
    return hint or (f" Shipped are {', '.join(shipped)}." if shipped else "")


def _files_in(path: Path) -> str:
    inside = sorted(file.name for file in path.glob("*.toml"))[:8] if path.is_dir() else []
    return f" Presets in it: {', '.join(inside)}." if inside else ""


def toml_table(text: str, name: str) -> dict[str, Any]:
    """The raw table of a text; PresetError in our words, with the line, where it is no TOML."""
    try:
        return tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise PresetError([_syntax(str(error), name, text)]) from None
    except ValueError as error:
        raise PresetError([f"{name}: a number in it has more digits than can be read."]) from error


def _syntax(message: str, name: str, text: str) -> str:
    """The reader's refusal as 'file:line: column ...'."""
    place = re.search(r" \(at (?:line (\d+), column (\d+)|end of document)\)$", message)
    reason = message[: place.start()] if place else message
    said = next((ours for theirs, ours in _IN_OUR_WORDS if reason.startswith(theirs)), reason)
    if place and place[1]:
        return f"{name}:{place[1]}: this is no TOML: at column {place[2]}, {said}."
    return f"{name}:{text.rstrip().count(chr(10)) + 1}: this is no TOML: at the end, {said}."


def _rates(mistakes: Mistakes, table: Mapping[str, Any], head: Mapping[str, Any]) -> tuple[float, ...]:
    """The rates that a preset is stated for, in its order; none after a mistake."""
    before = len(mistakes.found)
    rate, rates = head.get("rate"), head.get("rates")
    if "rate" in table and "rates" in table:
        mistakes.add(("rates",), "rates stands beside rate: state one of them.")
    if "rate" not in table and "rates" not in table:
        mistakes.add((), "rate is missing: a number of hertz.")
    if rate is not None and rate <= 0:
        mistakes.value(("rate",), rate, "is not allowed: a sample rate is a number of hertz above 0.")
    if rates is not None and (min(rates) <= 0 or len(set(rates)) < len(rates)):
        mistakes.value(("rates",), rates, "is not allowed: sample rates are numbers of hertz above 0, each stated once.")
    if len(mistakes.found) > before:
        return ()
    return (rate,) if rate is not None else tuple(rates or ())


def _title(mistakes: Mistakes, title: str | None, path: Path | None) -> str:
    if title is None:
        return path.stem if path else UNNAMED
    if not title.strip() or not title.isprintable():
        mistakes.value(("title",), title, "is not allowed: a title is one line of printable text.")
    return title


def _structure(mistakes: Mistakes, table: Mapping[str, Any]) -> dict[str, Any]:
    from streamhost import structures

    stated = read_table(mistakes, table, ("structure",), StructureTable)
    choices = {
        "form": structures.forms(), "decomposition": structures.decompositions(), "pairing": structures.PAIRINGS,
        "ordering": structures.ORDERINGS, "scaling": structures.SCALINGS, "outputs": structures.OUTPUTS,
    }
    for key, value in stated.items():
        allowed = tuple(choices[key])
        if value not in allowed:
            mistakes.value(("structure", key), value, f"is not known: {listed(allowed)}.{nearest(value, allowed)}")
    defaults = StructureTable()
    return {key: stated.get(key, getattr(defaults, key)) for key in choices}


def _limits(mistakes: Mistakes, table: Mapping[str, Any], rate: float | None) -> dict[str, object]:
    limits: dict[str, object] = read_table(mistakes, table, ("limits",), LimitsTable)
    deviation, band = limits.get("response_deviation_db"), limits.get("band_hz")
    if isinstance(deviation, float) and deviation < 0:
        mistakes.value(("limits", "response_deviation_db"), deviation, "is not allowed: a deviation is at least 0 dB.")
    if isinstance(band, list):
        top = rate / 2 if rate else float("inf")
        if len(band) != 2 or not 0 <= band[0] < band[1] <= top:
            half = f" ({top:g})" if rate else ""
            mistakes.value(
                ("limits", "band_hz"), band,
                f"is not allowed: two numbers of hertz that rise, from 0 to half the rate{half}.",
            )
        limits["band_hz"] = tuple(band)
    _check_mask(mistakes, limits)
    _check_changeover(mistakes, limits)
    return limits


def _check_mask(mistakes: Mistakes, limits: Mapping[str, object]) -> None:
    mask, mid = limits.get("mask"), limits.get("mask_hz")
    if isinstance(mask, str) and mask not in MASKS:
        mistakes.value(("limits", "mask"), mask, f"is not known: {listed(MASKS)}.{nearest(mask, MASKS)}")
    elif isinstance(mask, str) and mid is not None and mid not in MASKS[mask].nominals:
        mistakes.value(("limits", "mask_hz"), mid, f"is not allowed: {mid_bands_text(mask)}.")
    elif mid is not None and mask is None:
        mistakes.value(("limits", "mask_hz"), mid, "says of which band a mask is, and there is no mask.")


def _check_changeover(mistakes: Mistakes, limits: Mapping[str, object]) -> None:
    changeover, over = limits.get("changeover"), limits.get("changeover_ms")
    if isinstance(changeover, str) and changeover not in CHANGEOVERS:
        mistakes.value(("limits", "changeover"), changeover,
                       f"is not known: {listed(CHANGEOVERS)}.{nearest(changeover, CHANGEOVERS)}")
    if isinstance(over, float) and not 0.0 < over <= 1000.0:
        mistakes.value(("limits", "changeover_ms"), over, "is not allowed: a fade or ramp takes above 0 and at most 1000 ms.")
