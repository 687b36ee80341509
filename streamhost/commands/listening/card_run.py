"""`listen` on a sound card: unattended, or with the terminal's keys."""

import time
from contextlib import ExitStack
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING

import click

from streamhost.commands.common import check_place
from streamhost.commands.listening.asked import CARD, RECORDING_S, Asked, Prepared, prepare
from streamhost.commands.listening.told import Run, record_writer
from streamhost.commands.listening.watched import follow, preset_files
from streamhost.errors import MachineError

if TYPE_CHECKING:
    from streamhost.host.lane import Lane
    from streamhost.live.card import Card
    from streamhost.live.controls import Controls
    from streamhost.live.files import Files
    from streamhost.live.portaudio import Wanted
    from streamhost.live.recipe import Recipe

TELL_S = 0.03


def run(asked: Asked) -> Run:
    """From the first block to the last. MachineError where the card cannot be opened, or was lost at the end."""
    from streamhost.commands.listening.caution import acknowledge
    from streamhost.commands.listening.terminal import attend
    from streamhost.host.plan import changes_made
    from streamhost.host.recording import Recorder
    from streamhost.live.card import Card, Early
    from streamhost.live.controls import Controls

    attended = asked.seconds is None
    for place in (asked.json_file, asked.record):
        if place is not None and place != "-":
            check_place(Path(place))
    acknowledge(given=asked.volume_is_down, attended=attended)
    with ExitStack() as stack:
        early = stack.enter_context(Early())
        ready = prepare(asked, ideals=attended)
        lanes = [each.made(ready.channels) for each in ready.lanes]
        recipe = _recipe(asked, ready, lanes)
        card = stack.enter_context(Card(recipe, _wanted(asked, recipe), early))
        card.begin()
        card.set_monitor(asked.monitor_db)
        card.count_on(-1 if asked.counter is None else asked.counter - 1)
        if asked.record is not None:
            stack.enter_context(Recorder(card.shared, record_writer(asked, ready.rate, recipe.width)))
        controls = Controls(card, lanes, ready.changes[-1].lane if ready.changes else 0, monitor_db=asked.monitor_db)
        files = stack.enter_context(preset_files(asked, ready))
        if attended:
            attend(ready, controls, files)
        else:
            card.come_up()
            _unattended(asked, ready, controls, files)
        lost = card.is_lost
    if lost:
        raise MachineError(f"The sound card {card.losses[-1].reason} at frame {card.losses[-1].frame} and had not come back "
                           "when the time was over: there are no figures.")
    changes = [replace(each, lane=controls.number_of(each.lane), before=controls.number_of(each.before))
               for each in changes_made(card.shared)]
    return Run(ready, card.shared, asked.block, card.frame, changes, tuple(card.hashes), card.opened.callback,
               {"card": _card_figures(card)}, tuple(controls.slots))


def _recipe(asked: Asked, ready: Prepared, lanes: "list[Lane]") -> "Recipe":
    """All parts of the step are compiled here, so that the engine finds them whatever it is asked for."""
    from streamhost.host import Guard
    from streamhost.host.records import PARTS
    from streamhost.host.step import compile_part, compile_step
    from streamhost.live.controls import planned_in_order
    from streamhost.live.recipe import Recipe

    compile_step()
    for part in PARTS:
        compile_part(part)
    return Recipe(
        tuple(ready.lanes), ready.input, ready.channels, asked.block, inputs=ready.channels if asked.source == CARD else 0,
        outputs=max(ready.channels, asked.counter or 0), guard=Guard(asked.ceiling_dbfs, rise_db_per_s=asked.rise_db_per_s),
        planned=planned_in_order(ready.changes, lanes),
        recording=0 if asked.record is None else round(RECORDING_S * ready.rate),
    )


def _wanted(asked: Asked, recipe: "Recipe") -> "Wanted":
    from streamhost.live.portaudio import Wanted

    return Wanted(recipe.rate, recipe.block, recipe.outputs, recipe.inputs, _named(asked.device), _named(asked.input_device),
                  asked.latency_ms / 1000.0, "python" if asked.python_callback else "compiled")


def _named(device: str | None) -> str | int | None:
    return int(device) if device is not None and device.isdecimal() else device


def _unattended(asked: Asked, ready: Prepared, controls: "Controls", files: "Files") -> None:
    """Until so many seconds have been played, or have passed without a card."""
    assert asked.seconds is not None, "it was asked for"
    began = time.monotonic()
    while not _is_over(controls.card, asked.seconds, time.monotonic() - began):
        controls.tend()
        follow(files, ready, controls)
        if controls.notice:
            click.echo(controls.notice, err=True)
            controls.notice = ""
        time.sleep(TELL_S)


def _is_over(card: "Card", seconds: float, passed: float) -> bool:
    if card.is_lost:
        return passed >= seconds
    missed = sum(loss.seconds or 0.0 for loss in card.losses)
    return card.frame / card.recipe.rate + missed >= seconds


def _card_figures(card: "Card") -> dict[str, object]:
    losses = [{"frame": loss.frame, "reason": loss.reason, "seconds": loss.seconds} for loss in card.losses]
    return {"device": card.opened.device, "input_device": card.opened.input_device or None,
            "latency_ms": card.opened.latency_s * 1e3, "losses": losses}
