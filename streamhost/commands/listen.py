"""`streamhost listen`: realizations side by side, one of them heard."""

from contextlib import ExitStack
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

import click

from streamhost.commands.common import (
    Cell,
    Column,
    at_rate,
    check_place,
    force_option,
    json_option,
    ledger,
    presets_named,
    structures_option,
    vary_option,
    write_json,
)
from streamhost.errors import MachineError, RequestError

if TYPE_CHECKING:
    from streamhost.files import AudioWriter
    from streamhost.host import Host
    from streamhost.host.sources import Source
    from streamhost.presets import Preset

CHANGEOVERS = ("keep", "cold", "carry", "warm", "fade")
DEFAULT_SOURCE = "pink"
RECORDING_S = 4.0


@dataclass(frozen=True)
class Asked:
    """What the command line asks for."""

    presets: tuple[str, ...]
    variations: tuple[str, ...]
    input: str | None
    source: str | None
    rate: float | None
    channels: int
    block: int
    seconds: float | None
    fast: bool
    changes: tuple[str, ...]
    matched: bool
    ceiling_dbfs: float
    monitor_db: float
    record: str | None
    force: bool
    json_file: str | None


@click.command()
@click.argument("presets", nargs=-1, required=True, metavar="PRESET...")
@click.option("--input", metavar="FILE", help="An audio file or the name of a shipped recording, over and over.")
@click.option("--source", metavar="KIND", default=None,
              help="silence, tone:1000, tones:60,7000, sweep:20,20000,10, white, pink, impulses:1 or dc:0.5, with a peak "
              "such as @-20.")
@click.option("--seconds", type=click.FloatRange(min=0.0, min_open=True), help="End after so long.")
@click.option("--block", type=click.IntRange(1, 65536), default=128, show_default=True, help="Frames of a block.")
@click.option("--rate", type=float, help="Of the presets, where they are stated for several.")
@click.option("--channels", type=click.IntRange(1, 64), default=2, show_default=True, help="Without a file.")
@click.option("--change", "changes", metavar="FRAME:LANE:CHANGEOVER", multiple=True,
              help="From this frame on another lane is heard, its state by keep, cold, carry, warm or fade. May be repeated.")
@click.option("--match", "matched", is_flag=True, help="Bring all lanes to the level of the first, on pink noise.")
@click.option("--monitor-db", type=click.FloatRange(max=0.0), default=0.0, show_default=True, help="The monitor's gain.")
@click.option("--ceiling-dbfs", type=click.FloatRange(max=0.0), default=0.0, show_default=True, help="Nothing louder goes out.")
@click.option("--record", metavar="FILE", help="What is heard, before the monitor's gain, into a file.")
@click.option("--no-device", is_flag=True, help="On the clock, without a sound card.")
@click.option("--fast", is_flag=True, help="With --no-device: as fast as it goes.")
@click.option("--no-page", is_flag=True, help="Without the control page.")
@vary_option
@structures_option
@force_option
@json_option
def listen(no_device: bool, no_page: bool, **asked: object) -> None:
    """Realizations side by side on what comes in, one of them heard, lane 1 at first.

    Each PRESET is a lane: a file or the name of a shipped one.
    """
    if not no_device:
        raise MachineError("The sound card is not served yet: --no-device runs the lanes on the clock.")
    if asked["seconds"] is None:
        raise RequestError("Without a sound card and a page --seconds says when to end.")
    _on_clock(Asked(**asked))  # type: ignore[arg-type]


def _on_clock(asked: Asked) -> None:
    from streamhost.host.clock import run_on_clock
    from streamhost.host.recording import Recorder, wait_for_room

    for place in (asked.json_file, asked.record):
        if place is not None and place != "-":
            check_place(Path(place))
    host, presets = _prepared(asked)
    assert asked.seconds is not None, "it was asked for"
    with ExitStack() as stack:
        if asked.record is None:
            def between() -> None: ...
        else:
            recorder = stack.enter_context(Recorder(host.shared, _writer(host, asked)))

            def between() -> None:
                wait_for_room(recorder, host.block if asked.fast else 0)
        host.come_up()
        run_on_clock(host, round(asked.seconds * host.rate), real_time=not asked.fast, between=between)
    click.echo("\n".join(_told(host, presets)))
    if asked.json_file is not None:
        write_json(asked.json_file, _document(host, presets), force=asked.force)


def _prepared(asked: Asked) -> "tuple[Host, list[Preset]]":
    """The host with every lane and change, and the presets of its lanes."""
    from streamhost.formats import Fixed
    from streamhost.host import Device, Guard, Host, Lane
    from streamhost.host.matching import matching_gains
    from streamhost.host.plan import parse_change
    from streamhost.presets.realizing import realize_presets

    presets = presets_named(asked.presets, asked.variations)
    planned = sorted((parse_change(each, len(presets)) for each in asked.changes), key=lambda change: change.frame)
    presets, source, channels = _input(asked, presets)
    realizations = realize_presets(presets, channels)
    gains = matching_gains(realizations) if asked.matched else [1.0] * len(realizations)
    lanes = [Lane(each, channels, metered=isinstance(each.format, Fixed), match=gain)
             for each, gain in zip(realizations, gains, strict=True)]
    recording = 0 if asked.record is None else round(RECORDING_S * realizations[0].rate)
    host = Host(lanes, asked.block, device=Device(0, channels), source=source, guard=Guard(asked.ceiling_dbfs),
                waiting=max(256, len(planned)), recording=recording)
    host.set_monitor(asked.monitor_db)
    for change in planned:
        host.plan.change(change)
    return host, presets


def _input(asked: Asked, presets: "list[Preset]") -> "tuple[list[Preset], Source, int]":
    """The presets at the rate of what comes in, that, and its channels."""
    from streamhost.host.sources import generated, looped
    from streamhost.shipped import resolve

    if asked.input is not None and asked.source is not None:
        raise RequestError("--input and --source both say what comes in: give one of them.")
    if asked.input is None:
        rate = presets[0].rate if asked.rate is None else asked.rate
        source = generated(asked.source or DEFAULT_SOURCE, rate, asked.channels)
        return [preset.at(rate) for preset in presets], source, asked.channels
    from streamhost.files import read_all

    samples, info = read_all(resolve(asked.input, "sample"))
    return [at_rate(preset, info, asked.input) for preset in presets], looped(samples, info.path.name), info.channels


def _writer(host: "Host", asked: Asked) -> "AudioWriter":
    from streamhost.files import AudioWriter

    assert asked.record is not None, "it was asked for"
    return AudioWriter(asked.record, rate=round(host.rate), channels=host.channels * host.outputs, subtype="float",
                       overwrite=asked.force)


def _document(host: "Host", presets: "list[Preset]") -> dict[str, object]:
    from dataclasses import asdict

    from streamhost.host.figures import change_figures, guard_figures, lane_figures, run_figures

    columns = host.channels * host.outputs
    lanes = []
    for number, (lane, preset) in enumerate(zip(host.lanes, presets, strict=True)):
        realization = lane.realization
        lanes.append({
            "lane": number + 1, "preset": preset.source.name, "title": preset.title, "form": realization.form,
            "decomposition": realization.decomposition, "format": realization.format.label,
            **asdict(lane_figures(host.shared, number, columns, host.rate)), "state_sha256": lane.state_hash(),
        })
    return {
        **run_figures(host.shared, host.block, host.rate), "frames": host.frames, "rate": host.rate, "lanes": lanes,
        "changes": change_figures(host.plan.changed), "guard": asdict(guard_figures(host.shared)), "callback": "python",
    }


def _told(host: "Host", presets: "list[Preset]") -> list[str]:
    """What happened, in a ledger and a few sentences."""
    from streamhost.host.figures import guard_figures, lane_figures, run_figures

    rows: list[list[Cell]] = []
    for number, (lane, preset) in enumerate(zip(host.lanes, presets, strict=True)):
        figures = lane_figures(host.shared, number, host.channels * host.outputs, host.rate)
        about = f"{lane.realization.form} · {lane.realization.decomposition} · {lane.realization.format.label}"
        rows.append([preset.title, about, figures.peak_dbfs, figures.rms_dbfs, figures.saturations + figures.wraps,
                     figures.load_percent])
    columns = [Column("lane"), Column("form · decomposition · format"), Column("peak", "dBFS", 1), Column("rms", "dBFS", 1),
               Column("overflows"), Column("load", "%", 2)]
    run, guard = run_figures(host.shared, host.block, host.rate), guard_figures(host.shared)
    lines = [ledger(columns, rows), ""]
    lines += [f"Lane {change.lane + 1} is heard from frame {change.frame} on, by {change.changeover}."
              for change in host.plan.changed]
    lines.append(f"{run['blocks']} blocks of {host.block} frames: half of them within {run['step_p50_us']:.1f} us, 99.9 % "
                 f"within {run['step_p999_us']:.1f} us, all within {run['step_max_us']:.1f} us of {run['deadline_us']:.0f} us.")
    if guard.reason:
        lines.append(f"The guard has shut at frame {guard.frame}: {guard.reason} in lane {guard.lane + 1}.")
    if guard.held:
        lines.append(f"The ceiling held {guard.held} samples.")
    return lines
