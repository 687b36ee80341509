"""`streamhost compare`: all realizations of one filter on one signal."""

from collections.abc import Sequence
from contextlib import AbstractContextManager, ExitStack, nullcontext
from dataclasses import dataclass, replace
from pathlib import Path
from typing import TYPE_CHECKING

import click

from streamhost.commands.common import (
    Progress,
    at_rate,
    check_figures,
    check_report,
    force_option,
    json_option,
    presets_named,
    report_option,
    structures_option,
    tell_report,
    vary_option,
    write_json,
)
from streamhost.errors import RequestError

if TYPE_CHECKING:
    from streamhost.commands.compare_files import Destination
    from streamhost.files import AudioInfo
    from streamhost.measure import Measured, RoundingNoise, Verdict
    from streamhost.presets import Preset
    from streamhost.presets.realizing import Refusal
    from streamhost.realization import Realization


@dataclass(frozen=True)
class Compared:
    """One realization of the comparison: what was asked, what was found, and the files that were written.

    `files`: of each output its audio and its difference, None where that was not written; empty without a folder.
    noise: with spectra, kept for a report.
    """

    preset: "Preset"
    realization: "Realization"
    measured: "Measured"
    verdicts: "tuple[Verdict, ...]"
    files: tuple[tuple[Path, Path | None], ...]
    noise: "RoundingNoise | None" = None

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
@report_option
@vary_option
@json_option
@structures_option
@force_option
def compare(
    presets: Sequence[str], source: str, folder: str | None, report: str | None, variations: Sequence[str],
    json_file: str | None, force: bool,
) -> int:
    """All realizations of one filter on one signal: a table, the audio, the differences.

    Every PRESET is a preset file or the name of a shipped one; all ask for the same filter. The difference is the
    realization's output minus that of its ideal: unrounded arithmetic with the same stored coefficients on the same
    quantized input. Of a filter with several outputs each has a line and files of its own. Exit status 1 says that a
    limit of a preset is not met. When the run is broken off, the files of the realizations that were done stay.
    """
    from streamhost.commands.compare_files import destinations, output_folder
    from streamhost.commands.compare_text import document, refused
    from streamhost.commands.report_compare import write_compared
    from streamhost.files import probe
    from streamhost.presets.realizing import realize_those_that_carry
    from streamhost.shipped import resolve

    info = probe(resolve(source, "sample"))
    asked = [at_rate(preset, info, source) for preset in presets_named(presets, variations)]
    made, refusals = realize_those_that_carry(asked, info.channels)
    if not made:
        raise RequestError(" ".join(refused(refusals)))
    stated, realizations = [preset for preset, _ in made], [realization for _, realization in made]
    for preset, realization in zip(stated, realizations, strict=True):
        realization.check_samples(preset.source.name)
    _check_one_filter(stated, realizations)
    check_report(report, force=force)
    places = destinations(folder, stated, realizations[0].outputs, info, force=force)
    with output_folder(places), _report_folder(report, force=force) as shown:
        check_figures(json_file, info.path, force=force)
        if shown is not None and folder is None:
            places = destinations(str(shown / "audio"), stated, realizations[0].outputs, info, force=force)
        compared = _compare_all(stated, realizations, info, places, spectra=report is not None, force=force)
        if shown is not None:
            write_compared(shown, compared, info, source, refusals)
    if folder is None:
        compared = [replace(one, files=()) for one in compared]
    _tell(compared, info, refusals, report, json_file)
    if json_file is not None:
        write_json(json_file, document(compared, info, source, refusals), force=force)
    return int(any(one.misses for one in compared))


def _tell(
    compared: "Sequence[Compared]", info: "AudioInfo", refusals: "Sequence[Refusal]", report: str | None, json_file: str | None
) -> None:
    """On the terminal; where the figures are there, only what is missed."""
    from streamhost.cache import notice
    from streamhost.commands.compare_text import misses, text

    if problem := notice():
        click.echo(problem, err=True)
    if json_file != "-":
        click.echo(text(compared, info, refusals))
        tell_report(report)
    elif missed := list(misses(compared)):
        click.echo("\n".join(missed), err=True)


def _report_folder(report: str | None, *, force: bool) -> AbstractContextManager[Path | None]:
    """The folder of the report while it is made; None where none is asked for."""
    from streamhost.report import report_folder

    return nullcontext() if report is None else report_folder(Path(report), force=force)


def _check_one_filter(presets: "Sequence[Preset]", realizations: "Sequence[Realization]") -> None:
    """RequestError unless all presets ask for one filter."""
    from streamhost.measure.sameness import different

    if others := different([realization.filters for realization in realizations]):
        named = ", ".join(f"{presets[place].source.name} ({presets[place].title})" for place in others)
        raise RequestError(
            f"{named}: not the filter that {presets[0].source.name} ({presets[0].title}) asks for. "
            "Realizations of one filter are compared: all presets have the same transfer function."
        )


def _compare_all(
    presets: "Sequence[Preset]", realizations: "Sequence[Realization]", info: "AudioInfo",
    places: "Sequence[Destination | None]", *, spectra: bool, force: bool,
) -> list[Compared]:
    compared = []
    with Progress("compare", len(presets)) as progress:
        for preset, realization, place in zip(presets, realizations, places, strict=True):
            progress.step(label(realization))
            compared.append(_compare_one(preset, realization, info, place, spectra=spectra, force=force))
    return compared


def _compare_one(
    preset: "Preset", realization: "Realization", info: "AudioInfo", place: "Destination | None", *, spectra: bool, force: bool
) -> Compared:
    from streamhost.commands.compare_files import DifferenceFile, OutputFile
    from streamhost.commands.instruments import limit_verdicts
    from streamhost.files import read_blocks
    from streamhost.measure import Measurement, limit_band
    from streamhost.measure.rounding.rounding_noise import figures_of

    measurement = Measurement(realization, info.frames, info.channels, limit_band(preset.limits, preset.rate))
    outputs: list[OutputFile] = []
    differences: list[DifferenceFile] = []
    with ExitStack() as stack:
        for destination in place.files if place is not None else ():
            outputs.append(stack.enter_context(OutputFile(destination.output, realization, info, force=force)))
            differences.append(stack.enter_context(DifferenceFile(destination.difference, info, force=force)))
        for x in read_blocks(info.path, measurement.block):
            block = measurement.step(x)
            for k, (output, difference) in enumerate(zip(outputs, differences, strict=True)):
                output.write(block.output[:, k])
                difference.write(block.difference[:, k])
    files = [(destination.output, destination.difference if difference.kept else None)
             for destination, difference in zip(place.files if place is not None else (), differences, strict=True)]
    found = measurement.result()
    noise = figures_of(realization, found, measurement) if spectra else None
    return Compared(preset, realization, found, limit_verdicts(preset, realization), tuple(files), noise)
