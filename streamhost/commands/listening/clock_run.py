"""`listen --no-device`: the lanes on the clock."""

from contextlib import ExitStack
from pathlib import Path

from streamhost.commands.common import check_place
from streamhost.commands.listening.asked import CARD, RECORDING_S, Asked, prepare
from streamhost.commands.listening.told import Run, record_writer
from streamhost.errors import RequestError


def run(asked: Asked) -> Run:
    """From the first frame to the last."""
    from streamhost.host import Device, Guard, Host
    from streamhost.host.clock import run_on_clock
    from streamhost.host.recording import Recorder, wait_for_room

    if asked.source == CARD:
        raise RequestError("--source device is the sound card's input, and --no-device runs without one.")
    for place in (asked.json_file, asked.record):
        if place is not None and place != "-":
            check_place(Path(place))
    assert asked.seconds is not None, "it was asked for"
    ready = prepare(asked)
    recording = 0 if asked.record is None else round(RECORDING_S * ready.rate)
    host = Host([each.made(ready.channels) for each in ready.lanes], asked.block, device=Device(0, ready.channels),
                source=ready.input.made(ready.rate, ready.channels), guard=Guard(asked.ceiling_dbfs),
                waiting=max(256, len(ready.changes)), recording=recording)
    host.set_monitor(asked.monitor_db)
    for change in ready.changes:
        host.plan.change(change)
    with ExitStack() as stack:
        if asked.record is None:
            def between() -> None: ...
        else:
            recorder = stack.enter_context(Recorder(host.shared, record_writer(asked, host.rate, host.channels * host.outputs)))

            def between() -> None:
                wait_for_room(recorder, host.block if asked.fast else 0)
        host.come_up()
        run_on_clock(host, round(asked.seconds * host.rate), real_time=not asked.fast, between=between)
    hashes = tuple(lane.state_hash() for lane in host.lanes)
    return Run(ready, host.shared, host.block, host.frames, host.plan.changed, hashes, "python")
