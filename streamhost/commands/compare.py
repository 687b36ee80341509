"""`streamhost compare`: all realizations of one filter on one signal."""

from collections.abc import Mapping, Sequence
from contextlib import ExitStack
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

import click

from streamhost.commands.common import Progress, force_option, json_option, presets_named, vary_option, write_json
from streamhost.errors import RequestError

if TYPE_CHECKING:
    from streamhost.commands.compare_files import Destination
    from streamhost.files import AudioInfo
    from streamhost.measure import Measured, Verdict
    from streamhost.presets import Preset
    from streamhost.realization import Realization


@dataclass(frozen=True)
class Compared:
    """One realization of the comparison: what was asked, what was found, and the files that were written."""

    preset: "Preset"
    realization: "Realization"
    measured: "Measured"
    verdicts: "tuple[Verdict, ...]"
    output: Path | None
    difference: Path | None

    @property
    def label(self) -> str:
        return label(self.realization)

    @property
    def misses(self) -> "list[Verdict]":
        return [verdict for verdict in self.verdicts if not verdict.meets]


def label(realization: "Realization") -> str:
    """Form, decomposition and format, as tables show them."""
    return f"{realization.form} · {realization.decomposition} · {realization.format.label}"


@click.command()
@click.argument("presets", metavar="PRESET...", nargs=-1, required=True)
@click.option("--input", "source", metavar="IN", required=True, help="An audio file, or a shipped recording's name.")
@click.option("--output", "folder", metavar="DIR", help="Write each output and each difference into this folder.")
@vary_option
@json_option
@force_option
def compare(
    presets: Sequence[str], source: str, folder: str | None, variations: Sequence[str], json_file: str | None,
    force: bool,
) -> int:
    """All realizations of one filter on one signal: a table, the audio, the differences.

    Every PRESET is a preset file or the name of a shipped one; all ask for the same filter. The difference is the
    realization's output minus that of its ideal: unrounded arithmetic with the same stored coefficients on the same
    quantized input. Exit status 1 says that a limit of a preset is not met. When the run is broken off, the files of
    the realizations that were done stay.
    """
    from streamhost.cache import notice
    from streamhost.commands.compare_files import check_figures, destinations, output_folder
    from streamhost.commands.compare_text import document, misses, text
    from streamhost.files import probe
    from streamhost.shipped import resolve

    info = probe(resolve(source, "sample"))
    stated = presets_named(presets, variations)
    realizations = _realized(stated)
    _check_one_filter(stated, info, source)
    places = destinations(folder, stated, info, force=force)
    with output_folder(places):
        check_figures(json_file, info, force=force)
        compared = _compare_all(stated, realizations, info, places, force=force)
    if problem := notice():
        click.echo(problem, err=True)
    if json_file != "-":
        click.echo(text(compared, info))
    elif missed := list(misses(compared)):
        click.echo("\n".join(missed), err=True)
    if json_file is not None:
        write_json(json_file, document(compared, info, source), force=force)
    return int(any(one.misses for one in compared))


def _realized(presets: "Sequence[Preset]") -> "list[Realization]":
    from streamhost.presets.realizing import realize_presets

    realizations = realize_presets(presets)
    for preset, realization in zip(presets, realizations, strict=True):
        if len(realization.outputs) > 1:
            raise RequestError(
                f"{preset.source.name}: this realization has {len(realization.outputs)} outputs "
                f"({', '.join(realization.outputs)}), and those with one output can be compared so far."
            )
    return realizations


def _check_one_filter(presets: "Sequence[Preset]", info: "AudioInfo", source: str) -> None:
    """RequestError unless all presets ask for one filter at the rate of the file."""
    from streamhost.measure.sameness import different

    for preset in presets:
        if preset.rate != info.rate:
            raise RequestError(
                f"{preset.source.name}: this preset has a rate of {preset.rate:g} Hz, and {source} has "
                f"{info.rate} Hz. Rates are not converted: give a file of that rate, or a preset for this one."
            )
    if others := different([preset.filter for preset in presets]):
        named = ", ".join(f"{presets[place].source.name} ({presets[place].title})" for place in others)
        raise RequestError(
            f"{named}: not the filter that {presets[0].source.name} ({presets[0].title}) asks for. "
            "Realizations of one filter are compared: all presets have the same transfer function."
        )


def _compare_all(
    presets: "Sequence[Preset]", realizations: "Sequence[Realization]", info: "AudioInfo",
    places: "Sequence[Destination | None]", *, force: bool,
) -> list[Compared]:
    compared = []
    with Progress("compare", len(presets)) as progress:
        for preset, realization, place in zip(presets, realizations, places, strict=True):
            progress.step(label(realization))
            compared.append(_compare_one(preset, realization, info, place, force=force))
    return compared


def _compare_one(
    preset: "Preset", realization: "Realization", info: "AudioInfo", place: "Destination | None", *, force: bool
) -> Compared:
    from streamhost.commands.compare_files import DifferenceFile, OutputFile
    from streamhost.files import read_blocks
    from streamhost.measure import Measurement, limit_band

    measurement = Measurement(realization, info.frames, info.channels, limit_band(preset.limits, preset.rate))
    output = difference = None
    with ExitStack() as stack:
        if place is not None:
            output = stack.enter_context(OutputFile(place.output, realization, info, force=force))
            difference = stack.enter_context(DifferenceFile(place.difference, info, force=force))
        for x in read_blocks(info.path, measurement.block):
            block = measurement.step(x)
            if output is not None and difference is not None:
                output.write(block.output)
                difference.write(block.difference)
    verdicts = _verdicts(preset.limits, realization)
    return Compared(
        preset, realization, measurement.result(), verdicts, place.output if place is not None else None,
        place.difference if place is not None and difference is not None and difference.kept else None,
    )


def _verdicts(limits: Mapping[str, object], realization: "Realization") -> "tuple[Verdict, ...]":
    from streamhost.measure import limit_band, limit_signal, measure, verdicts

    if not limits.keys() - {"band_hz"}:
        return ()
    rate = realization.filter.rate
    return verdicts(limits, measure(realization, limit_signal(rate), limit_band(limits, rate)))
