"""One setting: its realization, and what it is worth."""

from collections.abc import Mapping
from dataclasses import dataclass
from math import inf

from streamhost.diagram.norms import settling_frames, sums_from_input
from streamhost.errors import PresetError
from streamhost.formats import Fixed
from streamhost.measure.bands import Band
from streamhost.measure.deviation import Deviation, response_deviation
from streamhost.measure.levels import decibels
from streamhost.measure.overflows.places import places
from streamhost.measure.predicted import predicted_band_noise
from streamhost.measure.realized.stability import stability_of
from streamhost.measure.settings.grid import Grid, Point
from streamhost.measure.settings.result import Setting
from streamhost.presets import Preset
from streamhost.presets.knobs import turned
from streamhost.presets.realizing import realize_preset
from streamhost.realization import Realization


@dataclass(frozen=True, eq=False)
class Judged:
    """A setting; its realization, None where it was refused; frames until it has settled, infinite where it does not."""

    setting: Setting
    realization: Realization | None
    settling: float


def judge(preset: Preset, grid: Grid, point: Point, band: Band) -> Judged:
    """Realize the preset with its knobs at a point, and find the figures."""
    positions, said = dict(zip(grid.knobs, point, strict=True)), grid.said(point)
    at = {knob.key: position for knob, position in positions.items()}
    try:
        realization = realize_preset(turned(preset, positions.items()))
    except PresetError as error:
        return Judged(Setting(preset.rate, at, said, refused=error.problems[0].rstrip(".")), None, inf)
    stability = stability_of(realization).verdict if realization.unstable else "stable"
    if stability != "stable":
        return Judged(Setting(preset.rate, at, said, stability=stability), realization, inf)
    return _judged(realization, Setting(preset.rate, at, said, stability=stability), band)


def _judged(realization: Realization, empty: Setting, band: Band) -> Judged:
    diagram = realization.program.diagram
    headroom, register = headroom_of(realization)
    found = Setting(
        empty.rate_hz, empty.at, empty.said, noise_of(realization), headroom, register, deviation_of(realization, band).db,
        empty.stability,
    )
    return Judged(found, realization, max(settling_frames(diagram, channel) for channel in range(diagram.channels)))


def noise_of(realization: Realization) -> float | None:
    """Predicted, the worst output and channel; None in floating point, where it depends on the signal."""
    if not isinstance(realization.format, Fixed):
        return None
    return max(predicted_band_noise(realization.program, realization.rate, output=output, channel=channel)
               for output in range(len(realization.outputs)) for channel in range(realization.program.diagram.channels))


def headroom_of(realization: Realization) -> tuple[float | None, str]:
    """Of the register with least, what its word holds over its L1 norm from the input, in dB, and its name."""
    program = realization.program
    if not isinstance(realization.format, Fixed):
        return None, ""
    there = places(program)
    nodes = sorted({node for place in there for node, _ in place.parts})
    least, name = inf, ""
    for channel in range(program.diagram.channels):
        sums: Mapping[int, float] = dict(
            zip(nodes, sums_from_input(program.diagram, channel, nodes=nodes).tolist(), strict=True))
        for place in there:
            l1 = sum(factor * sums[node] for node, factor in place.parts)
            headroom = decibels((place.largest / l1) ** 2) if l1 else inf
            if headroom < least:
                least, name = headroom, place.name
    return least, name


def deviation_of(realization: Realization, band: Band, *, zoomed: bool = False) -> Deviation:
    """The largest of all outputs."""
    each = [response_deviation(realization, band, (output,), zoomed=zoomed) for output in range(len(realization.outputs))]
    return max(each, key=lambda one: -inf if one.db is None else one.db)
