"""`listen --no-device`: the lanes on the clock."""

from collections.abc import Callable
from contextlib import ExitStack, suppress
from pathlib import Path
from typing import TYPE_CHECKING

from streamhost.commands.common import check_place
from streamhost.commands.listening.asked import CARD, RECORDING_S, Asked, prepare
from streamhost.commands.listening.told import Run, record_writer
from streamhost.errors import RequestError

if TYPE_CHECKING:
    from streamhost.host import Host

RECENT = 1 << 15
"""Frames that a page can look back."""

FOREVER = 1 << 62


def run(asked: Asked) -> Run:
    """From the first frame to the last."""
    from streamhost.commands.listening.page import serve
    from streamhost.host import Device, Guard, Host
    from streamhost.host.recording import Recorder, wait_for_room

    if asked.source == CARD:
        raise RequestError("--source device is the sound card's input, and --no-device runs without one.")
    for place in (asked.json_file, asked.record):
        if place is not None and place != "-":
            check_place(Path(place))
    ready = prepare(asked, ideals=not asked.no_page)
    recording = 0 if asked.record is None else round(RECORDING_S * ready.rate)
    host = Host([each.made(ready.channels) for each in ready.lanes], asked.block, device=Device(0, ready.channels),
                source=ready.input.made(ready.rate, ready.channels), guard=Guard(asked.ceiling_dbfs),
                waiting=max(256, len(ready.changes)), recent=0 if asked.no_page else RECENT, recording=recording)
    host.set_monitor(asked.monitor_db)
    for change in ready.changes:
        host.plan.change(change)
    with ExitStack() as stack:
        waiting: list[Callable[[], None]] = []
        if asked.record is not None:
            recorder = stack.enter_context(Recorder(host.shared, record_writer(asked, host.rate, host.channels * host.outputs)))
            waiting.append(lambda: wait_for_room(recorder, host.block if asked.fast else 0))
        if not asked.no_page:
            waiting.append(stack.enter_context(serve(host, ready.presets, asked)))

        def between() -> None:
            for each in waiting:
                each()

        _run(asked, host, between)
    hashes = tuple(lane.state_hash() for lane in host.lanes)
    return Run(ready, host.shared, host.block, host.frames, host.plan.changed, hashes, "python")


def _run(asked: Asked, host: "Host", between: Callable[[], None]) -> None:
    """For the seconds that were asked for; else muted at first, until Ctrl-C."""
    from streamhost.host.clock import run_on_clock

    if asked.seconds is not None:
        host.come_up()
    frames = FOREVER if asked.seconds is None else round(asked.seconds * host.rate)
    with suppress(KeyboardInterrupt):
        run_on_clock(host, frames, real_time=not asked.fast, between=between)
