"""What a realization can be changed to: neighbouring settings of a preset's parameters, and other forms."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import partial

from streamhost.errors import FilterError, FormatError, PresetError, RequestError, StructureError
from streamhost.presets import Preset
from streamhost.presets.knobs import Knob, Position, knobs, turned
from streamhost.presets.realizing import realize_preset
from streamhost.realization import Realization, realize

FORMS = ("direct-1", "direct-2", "transposed-2")
"""What a form is changed to, unless said: the direct forms, each under the decomposition as it is."""

TONE_HZ = 997.0
"""Of the tone where no parameter names a frequency (AES17-2015, the standard's frequency)."""


@dataclass(frozen=True, eq=False)
class Target:
    """What is changed to, or the reason why it cannot be. kind: "parameter" or "form".

    between: the realization so far on the way there, 0 to 1; None where there is no way. tone_hz: of the tone it is tried on.
    """

    change: str
    kind: str
    realization: Realization | None
    reason: str = ""
    between: Callable[[float], Realization] | None = None
    tone_hz: float = TONE_HZ


def parameter_targets(preset: Preset, realization: Realization, *, steps: Sequence[float] = (1, -1)) -> list[Target]:
    """Each parameter that the preset states, so many steps of `presets/knobs.py` away."""
    channels = realization.diagram.channels
    return [_turned(preset, channels, knob, to) for knob in knobs(preset) for count in steps
            if (to := knob.turned(count)) != knob.at]


def to_setting(preset: Preset, realization: Realization, key: str, position: Position) -> Target:
    """One parameter at a given position, its key as --vary spells it. RequestError for a key that the preset has not."""
    found = {knob.key: knob for knob in knobs(preset)}
    if key not in found:
        raise RequestError(f'{preset.source.name} has no parameter "{key}" to change: {", ".join(found) or "none"}.')
    return _turned(preset, realization.diagram.channels, found[key], position)


def _turned(preset: Preset, channels: int, knob: Knob, to: Position) -> Target:
    change = f"{knob.key} {knob.said(knob.at)} to {knob.said(to)}"

    def at(position: Position) -> Realization:
        return realize_preset(turned(preset, [(knob, position)]), channels)

    try:
        there = at(to)
    except PresetError as error:
        return Target(change, "parameter", None, _first(error.problems[0], preset))
    beside = {each.name: each.at for each in knobs(preset) if each.filter == knob.filter}
    hertz = beside.get("frequency", TONE_HZ)
    tone = float(hertz[0] if isinstance(hertz, tuple) else hertz)
    return Target(change, "parameter", there, "", partial(_between, at, knob, to), tone)


def _between(at: Callable[[Position], Realization], knob: Knob, to: Position, share: float) -> Realization:
    return at(to if share == 1.0 else knob.between(to, share))


def _first(problem: str, preset: Preset) -> str:
    """A refusal without the file's name and line."""
    head, _, rest = problem.partition(": ")
    return (rest if head.startswith(preset.source.name) else problem).rstrip(".")


def form_targets(realization: Realization, forms: Sequence[str | tuple[str, str]] = FORMS) -> list[Target]:
    """The same filter in other forms, or in (form, decomposition), in the format of the realization."""
    found = []
    for each in forms:
        form, decomposition = (each, realization.decomposition) if isinstance(each, str) else each
        if (form, decomposition) == (realization.form, realization.decomposition):
            continue
        change = f"{realization.form} to {form}"
        if decomposition != realization.decomposition:
            change += f" · {decomposition}"
        try:
            there = realize(realization.filters if len(realization.filters) > 1 else realization.filter, form=form,
                            decomposition=decomposition, format=realization.format, allow_unstable=True)
        except (FilterError, FormatError, StructureError) as error:
            found.append(Target(change, "form", None, str(error).partition("\n")[0].rstrip(".")))
            continue
        found.append(Target(change, "form", there))
    return found
