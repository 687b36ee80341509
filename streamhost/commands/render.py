"""`streamhost render`: an audio file through one realization, or several that take over from each other."""

import math
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from streamhost.commands.common import MINUS, Progress, at_rate, force_option, presets_named, printable, structures_option

if TYPE_CHECKING:
    from streamhost.files import AudioInfo
    from streamhost.host.rendering import Rendered
    from streamhost.realization import Realization

SUBTYPES = ("pcm16", "pcm24", "pcm32", "float")


@click.command()
@click.argument("preset")
@click.argument("source", metavar="IN")
@click.argument("destination", metavar="OUT")
@click.option(
    "--subtype",
    type=click.Choice(SUBTYPES),
    help="Samples of OUT. Unless said: PCM of the shortest of 16, 24, 32 bits that holds the output word's fraction, "
    "32 bits for what is longer; 24 bits after floating point.",
)
@click.option("--lane", "more", metavar="PRESET", multiple=True,
              help="A further realization, lane 2, 3, ... that runs beside PRESET, which is lane 1. May be repeated.")
@click.option("--change", "changes", metavar="FRAME:LANE:CHANGEOVER", multiple=True,
              help="From this frame on another lane is heard, its state by keep, cold, carry, warm or fade. May be repeated.")
@structures_option
@force_option
def render(preset: str, source: str, destination: str, subtype: Any, more: tuple[str, ...], changes: tuple[str, ...],
           force: bool) -> None:
    """The audio file IN through one realization into a new file OUT.

    PRESET is a file or the name of a shipped one, and so is IN. OUT ends in .wav, .rf64 or .flac and gets the rate and
    the channels of IN; of a filter with several outputs each has a file, OUT with the output's name behind a hyphen.
    Samples beyond full scale are clipped, which is counted.

    With --lane and --change several realizations take over from each other at stated frames, bit for bit as when they
    are listened to:

    streamhost render rumble-float32 plucked out.wav --lane rumble-double-state --change 48000:2:carry
    """
    from streamhost.cache import notice
    from streamhost.files import probe
    from streamhost.host.plan import parse_change
    from streamhost.host.rendering import render_file
    from streamhost.presets.realizing import realize_presets
    from streamhost.shipped import resolve

    stated = presets_named([preset, *more])
    planned = [parse_change(each, len(stated)) for each in changes]
    info = probe(resolve(source, "sample"))
    realizations = realize_presets([at_rate(each, info, source) for each in stated], info.channels)
    with Progress("render", math.ceil(info.seconds / 60)) as progress:
        rendered = render_file(
            realizations[0],
            info,
            Path(destination),
            name=stated[0].source.name if len(stated) == 1 else "these lanes",
            more=realizations[1:],
            changes=planned,
            subtype=subtype,
            overwrite=force,
            report=_minute_by_minute(progress, info),
        )
    if problem := notice():
        click.echo(problem, err=True)
    lines = summary(rendered, realizations[0])
    lines += [line for realization in realizations[1:] for line in warnings(realization)]
    lines += [
        f"lane {change.lane + 1} is heard from frame {change.frame} on, by {change.changeover}"
        + (f"; {_count(change.clipped, 'state')} did not fit" if change.clipped else "")
        for change in rendered.changes
    ]
    click.echo("\n".join(lines))


def _minute_by_minute(progress: Progress, info: "AudioInfo") -> Callable[[int], None]:
    """Moves the progress line on with every minute of audio that begins."""
    begun = 0

    def report(done: int) -> None:
        nonlocal begun
        while begun * 60 * info.rate <= done:
            progress.step(f"minutes of {info.path.name}")
            begun += 1

    return report


def summary(rendered: "Rendered", realization: "Realization") -> list[str]:
    """Lines that say what was written and what happened on the way."""
    seconds = rendered.frames / rendered.rate
    clipped = sum(file.clipped for file in rendered.files)
    lines = [
        *(
            printable(
                f"{file.path}: {_count(rendered.frames, 'frame')} ({seconds:.2f} s), "
                f"{_count(rendered.channels, 'channel')}, {rendered.rate} Hz, {rendered.container} {rendered.subtype}"
            )
            for file in rendered.files
        ),
        f"peak {_decibels(rendered.meters.peak_dbfs)}, {_count(clipped, 'sample')} clipped, no NaN",
    ]
    counted = _events(rendered)
    if counted:
        lines.append(", ".join(counted))
    return lines + warnings(realization)


def warnings(realization: "Realization") -> list[str]:
    """What is wrong with it for certain."""
    lines = []
    if realization.unstable:
        lie = "lies" if realization.unstable == 1 else "lie"
        poles = f"{_count(realization.unstable, 'pole')} {lie} on or outside the unit circle"
        lines.append(f"unstable {realization.unstable_since}: {poles}")
    return lines + [f"hazard: {sentence}" for sentence in realization.hazards]


def _events(rendered: "Rendered") -> list[str]:
    tally = rendered.tally
    kinds = (
        (tally.saturations, "saturation"),
        (tally.wraps, "wrap"),
        (tally.accumulator_overflows, "accumulator overflow"),
    )
    return [_count(number, kind) for number, kind in kinds if number]


def _count(number: int, what: str) -> str:
    return f"{number} {what}" if number == 1 else f"{number} {what}s"


def _decibels(value: float) -> str:
    return "silence" if value == -math.inf else f"{value:.2f} dBFS".replace("-", MINUS)
