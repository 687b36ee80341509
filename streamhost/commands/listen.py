"""`streamhost listen`: realizations side by side, one of them heard."""

import sys
from typing import TYPE_CHECKING

import click

from streamhost.commands.common import force_option, json_option, structures_option, vary_option, write_json
from streamhost.errors import RequestError

if TYPE_CHECKING:
    from streamhost.commands.listening.asked import Asked
    from streamhost.commands.listening.told import Run


def _list_devices(ctx: click.Context, param: click.Parameter, value: bool) -> None:
    if not value or ctx.resilient_parsing:
        return
    from streamhost.commands.listening.devices import device_ledger

    click.echo(device_ledger())
    ctx.exit()


@click.command()
@click.argument("presets", nargs=-1, required=True, metavar="PRESET...")
@click.option("--input", metavar="FILE", help="An audio file or the name of a shipped recording, over and over.")
@click.option("--source", metavar="KIND", default=None,
              help="device (what comes in through the card), or silence, tone:1000, tones:60,7000, sweep:20,20000,10, white, "
              "pink, impulses:1 or dc:0.5, with a peak such as @-20.")
@click.option("--device", metavar="NAME", help="The sound card: its name, a part of it, or its number. The system's own unless "
              "said.")
@click.option("--input-device", metavar="NAME", help="Where --source device comes in, if by another card.")
@click.option("--devices", is_flag=True, is_eager=True, expose_value=False, callback=_list_devices,
              help="List the sound cards and exit.")
@click.option("--latency-ms", type=click.FloatRange(1.0, 1000.0), default=20.0, show_default=True,
              help="What the card is asked for; it may take more.")
@click.option("--seconds", type=click.FloatRange(min=0.0, min_open=True),
              help="Unattended: come up at once, end after so long.")
@click.option("--block", type=click.IntRange(1, 65536), default=128, show_default=True, help="Frames of a block.")
@click.option("--rate", type=float, help="Of the presets, where they are stated for several.")
@click.option("--channels", type=click.IntRange(1, 64), default=2, show_default=True, help="Without a file.")
@click.option("--change", "changes", metavar="FRAME:LANE:CHANGEOVER", multiple=True,
              help="From this frame on another lane is heard, its state by keep, cold, carry, warm or fade. May be repeated.")
@click.option("--match", "matched", is_flag=True, help="Bring all lanes to the level of the first, on pink noise.")
@click.option("--monitor-db", type=click.FloatRange(max=0.0), default=0.0, show_default=True, help="The monitor's gain.")
@click.option("--ceiling-dbfs", type=click.FloatRange(max=0.0), default=0.0, show_default=True, help="Nothing louder goes out.")
@click.option("--rise-db-per-s", type=click.FloatRange(1.0, 600.0), default=30.0, show_default=True,
              help="How fast the output comes up from 60 dB below.")
@click.option("--record", metavar="FILE", help="What is heard, before the monitor's gain, into a file.")
@click.option("--counter", type=click.IntRange(1, 64), hidden=True,
              help="On this channel of the card a count of frames, k / 2^24: finds gaps in what was recorded behind it.")
@click.option("--python-callback", is_flag=True, hidden=True, help="The card calls the step through Python.")
@click.option("--volume-is-down", is_flag=True, help="Acknowledges the caution that stands before the first sound.")
@click.option("--no-device", is_flag=True, help="On the clock, without a sound card.")
@click.option("--fast", is_flag=True, help="With --no-device: as fast as it goes.")
@click.option("--no-page", is_flag=True, help="Without the control page, which --no-device has.")
@click.option("--no-browser", is_flag=True, help="Say the page's address and open nothing.")
@click.option("--port", type=click.IntRange(0, 65535), default=0, help="Of the page; any free one unless said.")
@vary_option
@structures_option
@force_option
@json_option
def listen(no_device: bool, **given: object) -> None:
    """Realizations side by side on what comes in, one of them heard, lane 1 at first.

    Each PRESET is a lane: a file or the name of a shipped one. On a terminal the output begins muted; ? lists the keys.
    With --no-device a page in the browser shows the lanes and takes the keys, until Ctrl-C or the end of --seconds.
    """
    from streamhost.commands.listening.asked import Asked
    from streamhost.commands.listening.told import document, told

    asked = Asked(**given)  # type: ignore[arg-type]
    if asked.fast and not no_device:
        raise RequestError("--fast is for --no-device: a sound card sets the time.")
    run = _run(asked, on_clock=no_device)
    if asked.json_file != "-":
        click.echo("\n".join(told(run)))
    if asked.json_file is not None:
        write_json(asked.json_file, document(run), force=asked.force)


def _run(asked: "Asked", *, on_clock: bool) -> "Run":
    from streamhost.commands.listening import card_run, clock_run

    if on_clock and asked.fast and not asked.no_page:
        raise RequestError("--fast leaves no time to look at a page: give --no-page with it.")
    if asked.seconds is None and asked.no_page and on_clock:
        raise RequestError("Without a sound card and a page --seconds says when to end.")
    if asked.seconds is None and not on_clock and not (sys.stdin.isatty() and sys.stdout.isatty()):
        raise RequestError("Without a terminal and a page --seconds says when to end.")
    return clock_run.run(asked) if on_clock else card_run.run(asked)
