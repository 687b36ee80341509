"""From presets to what runs; a refusal names file, line and key, as those of reading do."""

import re
from collections.abc import Iterable, Mapping
from dataclasses import dataclass

from streamhost.errors import FilterError, FormatError, PresetError, StructureError
from streamhost.presets.lines import Path
from streamhost.presets.mistakes import Mistakes, value_text
from streamhost.presets.preset import Preset
from streamhost.realization import Realization, realize

# Where a place of the format is not stated, one of these decides it.
DECIDING = ("arithmetic", "signal")


def realize_preset(preset: Preset, channels: int | None = None) -> Realization:
    """What a preset states at its rate, ready to run on so many channels; unless said, on as many as it tells apart.

    Raises PresetError where filter, structure and format do not go together: unstable as asked, a choice that cannot
    carry this filter, a coefficient that does not fit, an accumulator that is too short.
    """
    mistakes = Mistakes(preset.source.name, preset.source.lines)
    count = preset.channels if channels is None else channels
    _check_channels(mistakes, preset, count)
    try:
        return _realized(preset, count)
    except FilterError as error:
        _add(mistakes, preset, ("filter",), str(error))
    except FormatError as error:
        _add(mistakes, preset, _format_path(preset, error), str(error))
    except StructureError as error:
        _add(mistakes, preset, _structure_path(error), str(error))
    raise PresetError(mistakes.texts())


def _realized(preset: Preset, channels: int) -> Realization:
    return realize(
        preset.filters(channels), form=preset.form, decomposition=preset.decomposition, pairing=preset.pairing,
        ordering=preset.ordering, scaling=preset.scaling, outputs=preset.outputs, format=preset.format,
        allow_unstable=preset.allow_unstable,
    )


@dataclass(frozen=True)
class Refusal:
    """A form that was sought and does not carry a preset's filter, or not with its numbers; `reason` is a clause."""

    preset: Preset
    reason: str


def realize_those_that_carry(
    presets: Iterable[Preset], channels: int | None = None
) -> tuple[list[tuple[Preset, Realization]], list[Refusal]]:
    """All of them but those that were sought among all forms and are refused; raises PresetError for any other refusal."""
    kept: list[Preset] = []
    refusals: list[Refusal] = []
    for preset in presets:
        if preset.source.sought and (reason := _refused(preset, channels)):
            refusals.append(Refusal(preset, reason))
        else:
            kept.append(preset)
    return list(zip(kept, realize_presets(kept, channels), strict=True)), refusals


def _refused(preset: Preset, channels: int | None) -> str:
    try:
        _realized(preset, preset.channels if channels is None else channels)
    except StructureError as error:
        return error.reason or str(error)
    except FormatError as error:
        return str(error).split(". ")[0]
    return ""


def realize_presets(presets: Iterable[Preset], channels: int | None = None) -> list[Realization]:
    """All of them on so many channels; raises PresetError with what is refused in any of them together."""
    realizations: list[Realization] = []
    problems: list[str] = []
    for preset in presets:
        try:
            realizations.append(realize_preset(preset, channels))
        except PresetError as error:
            problems += error.problems
    if problems:
        raise PresetError(dict.fromkeys(problems))
    return realizations


def _check_channels(mistakes: Mistakes, preset: Preset, channels: int) -> None:
    """PresetError where a filter is for a channel that is not there."""
    for index, band in enumerate(preset.designs[preset.rate]):
        if beyond := [channel for channel in band.channels if channel > channels]:
            there = "1 channel" if channels == 1 else f"{channels} channels"
            mistakes.value(("filter", index, "channels"), list(band.channels),
                           f"names channel {beyond[0]}, and there {'is' if channels == 1 else 'are'} {there}.")
    mistakes.raise_any()


def _add(mistakes: Mistakes, preset: Preset, path: Path, text: str) -> None:
    """The refusal behind 'key = value', where the key is stated, and with the values that were varied."""
    table = preset.source.table.get(str(path[0]))
    if len(path) > 1 and isinstance(table, Mapping) and path[1] in table:
        key, value = path[1], value_text(table[str(path[1])])
        said = f"{key} {value} "
        text = f"{key} = {value} {text.removeprefix(said)}" if text.startswith(said) else f"{key} = {value}: {text}"
    varied = f" (Varied: {', '.join(preset.source.varied)})" if preset.source.varied else ""
    mistakes.add(path, text + varied)


def _format_path(preset: Preset, error: FormatError) -> Path:
    """The key that the refusal is about, or the one that decides it, or the whole table."""
    if error.problems:
        return ("format", *error.problems[0][0].split("."))
    about = re.search("accumulator|coefficient", str(error))
    if about is None:
        return ("format",)
    key = {"coefficient": "coefficients"}.get(about[0], about[0])
    stated = preset.source.table.get("format", {})
    return ("format", next((each for each in (key, *DECIDING) if each in stated), key))


def _structure_path(error: StructureError) -> Path:
    """The choice that the refusal names first; a cascade is named without its key."""
    named = re.search(r'(form|decomposition|pairing|ordering|scaling|outputs) "', str(error))
    return ("structure", named[1] if named else "decomposition")
