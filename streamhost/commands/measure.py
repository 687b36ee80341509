"""`streamhost measure`: what a design review asks of one realization."""

from collections.abc import Sequence
from typing import TYPE_CHECKING

import click

from streamhost.commands.common import (
    at_rate,
    check_figures,
    check_report,
    force_option,
    json_option,
    presets_named,
    report_option,
    structures_option,
    tell_report,
    vary_one_option,
    write_json,
)
from streamhost.errors import RequestError

if TYPE_CHECKING:
    from streamhost.commands.instruments import Asked
    from streamhost.presets import Preset


class OnlyOption(click.Option):
    """Names the instruments in its help, for which alone they are imported here."""

    def get_help_record(self, ctx: click.Context) -> tuple[str, str] | None:
        from streamhost.commands.instruments import INSTRUMENTS

        names = ", ".join(instrument.name for instrument in INSTRUMENTS)
        self.help = f"Only these instruments and the limits they answer, for instance noise,response. There are {names}."
        return super().get_help_record(ctx)


@click.command()
@click.argument("name", metavar="PRESET")
@click.option("--only", cls=OnlyOption, metavar="NAMES")
@click.option("--input", "source", metavar="IN",
              help="An audio file, or a shipped recording's name. Unless said: the noise on which limits are checked.")
@click.option("--output", "folder", metavar="DIR", help="Write the worst cases that are audio into this folder.")
@click.option("--quick", is_flag=True, help="Shorter runs and smaller searches.")
@report_option
@vary_one_option
@json_option
@structures_option
@force_option
def measure(
    name: str, only: str | None, source: str | None, folder: str | None, quick: bool, report: str | None,
    variations: Sequence[str], json_file: str | None, force: bool,
) -> int:
    """What a design review asks of one realization, and whether it keeps the limits of its preset.

    PRESET is a preset file or the name of a shipped one. Limits are checked on a signal that is always the same, whatever
    IN is. Exit status 1 says that a limit is not met. Broken off by Ctrl-C, it tells and writes what is done.
    """
    from streamhost.cache import notice
    from streamhost.commands.main import INTERRUPTED
    from streamhost.commands.measure_run import chosen, measured
    from streamhost.commands.measure_text import document, misses, text
    from streamhost.commands.measure_waves import WaveFolder
    from streamhost.commands.report_measure import write_measured
    from streamhost.shipped import resolve

    instruments = chosen(only)
    asked = _asked(_one_preset(name, variations), source, quick=quick)
    file = resolve(source, "sample") if source is not None else None
    check_report(report, force=force)
    waves = WaveFolder(folder, asked, file, instruments, force=force)
    check_figures(json_file, file, force=force)
    found = measured(asked, instruments, waves, on_limit_signal=source is None)
    if report is not None:
        write_measured(report, found, asked, source, force=force)
    if problem := notice():
        click.echo(problem, err=True)
    if json_file != "-":
        click.echo(text(found, asked, source))
        tell_report(report)
    elif said := misses(found):
        click.echo("\n".join(said), err=True)
    if json_file is not None:
        write_json(json_file, document(found, asked, source), force=force)
    return INTERRUPTED if found.broken_off else int(any(not verdict.meets for verdict in found.verdicts))


def _one_preset(name: str, variations: Sequence[str]) -> "Preset":
    presets = presets_named([name], variations)
    if len(presets) != 1:
        raise RequestError(
            f"{name} with --vary is {len(presets)} realizations, and measure takes one: give one value for each key. "
            "compare takes them all."
        )
    return presets[0]


def _asked(stated: "Preset", source: str | None, *, quick: bool) -> "Asked":
    """The preset on the signal of a file, or on the one for limits. RequestError where they do not go together."""
    from streamhost.commands.instruments import Asked, asked_for_limits
    from streamhost.files import probe, read_all
    from streamhost.measure import limit_band
    from streamhost.presets.realizing import realize_preset
    from streamhost.shipped import resolve

    if source is None:
        realization = realize_preset(stated)
        realization.check_samples(stated.source.name)
        return asked_for_limits(stated, realization, quick=quick)
    info = probe(resolve(source, "sample"))
    preset = at_rate(stated, info, source)
    realization = realize_preset(preset, info.channels)
    realization.check_samples(preset.source.name)
    x, band = read_all(info.path)[0], limit_band(preset.limits, preset.rate)
    return Asked(preset, realization, x, band, quick, heard=info.path.stem, given=True)
