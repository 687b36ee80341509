"""The block engine: the same input through every lane, and one of them heard, by one call of the compiled step."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from streamhost.errors import RequestError
from streamhost.host.guard import Guard
from streamhost.host.lane import Lane
from streamhost.host.plan import Plan
from streamhost.host.queue import Queue
from streamhost.host.records import HOST, LOGGED, MOST_LANES, NOTHING
from streamhost.host.shared import Shared
from streamhost.host.sources import Source, device
from streamhost.host.step import compile_part, compile_step

BLOCK = 4096
"""Frames of a block unless said: small enough for the processor's cache, large enough that calls cost nothing."""

LEAST_PAST = 1024
WINDOW_S = 0.25
"""Meters that are shown are those of the last whole quarter of a second."""

@dataclass(frozen=True)
class Device:
    """What drives the host: channels in and out, and whether samples are float64 or, as of a sound card, float32."""

    inputs: int
    outputs: int = 0
    float32: bool = False

    @property
    def dtype(self) -> type[np.float32] | type[np.float64]:
        return np.float32 if self.float32 else np.float64


class Host:
    """Lanes that run on one input, of blocks of up to `block` frames; lane 0 is heard at first.

    How a signal is divided into blocks makes no difference to any bit. All lanes have the same channels and outputs, and a
    lane stands in one host. `waiting`: how many changes can wait; `recent`, `recording`: frames of the rings in `shared`;
    `begins`: what the lanes' frame counters begin at. Frames are counted from 0, the first one that is run.
    Raises RequestError where there is no lane, more than 16, or they differ in channels, outputs or rate.
    """

    def __init__(
        self,
        lanes: Sequence[Lane],
        block: int = BLOCK,
        *,
        device: Device | None = None,
        source: Source | None = None,
        guard: Guard | None = None,
        waiting: int = 256,
        recent: int = 0,
        recording: int = 0,
        begins: int = 0,
        shared: Shared | None = None,
    ) -> None:
        self.channels, self.outputs, self.rate = _common(lanes)
        if block < 1:
            raise RequestError(f"A host's blocks have at least 1 frame, not {block}.")
        assert len({id(lane) for lane in lanes}) == len(lanes), "a lane stands in a host once"
        self.lanes, self.block = list(lanes), block
        self.device = device or Device(self.channels)
        width = self.outputs * self.channels
        self.shared = shared or Shared(width, self.channels, recent, recording)
        self._step = compile_step()
        self._queue = Queue(self._step, self.shared, waiting)
        self.plan = Plan(self, self._queue)
        self._allocate(width)
        self._set(guard or Guard(), begins, source)
        for slot, lane in enumerate(self.lanes):
            self.adopt(lane, slot)
            lane.begin_at(begins)
            self._table[slot] = lane.address

    def _allocate(self, width: int) -> None:
        self._record = np.zeros(1, HOST)
        self._table = np.zeros(MOST_LANES, np.int64)
        self._x, self._sent = np.zeros((self.block, self.channels)), np.zeros((self.block, self.channels))
        self._heard = np.zeros((self.block, width))
        needed = max(LEAST_PAST, *(self.plan.past_frames(lane) for lane in self.lanes))
        self._past = np.zeros((needed, self.channels))
        self._shown = 0

    def _set(self, guard: Guard, begins: int, source: Source | None) -> None:
        shared, record = self.shared, self._record
        self.source = source or device()
        addresses = {
            "lanes": self._table, "control": shared.control, "meters": shared.meters, "histogram": shared.histogram,
            "actions": self._queue.slots, "log": shared.log, "source": self.source.record, "x": self._x,
            "heard": self._heard, "sent": self._sent, "input_recent": self._past,
        }
        if len(shared.heard):
            addresses |= {"heard_recent": shared.heard, "sent_recent": shared.sent}
        if len(shared.recording):
            addresses |= {"recording": shared.recording}
        numbers = {
            "channels": self.channels, "outputs": self.outputs, "block": self.block, "input_channels": self.device.inputs,
            "output_channels": self.device.outputs, "sample_bytes": 4 if self.device.float32 else 8,
            "recent_frames": len(shared.heard), "input_recent_frames": len(self._past),
            "recording_frames": len(shared.recording), "log_length": LOGGED, "window_frames": int(WINDOW_S * self.rate),
            "begins": begins, "frame": begins, "minus": NOTHING, "raise_by": 1.0, "rate_hz": self.rate,
            "address": self.address,
        }
        for name, array in addresses.items():
            record[name] = array.ctypes.data
        for name, value in numbers.items():
            record[name] = value
        self.need("generate", self.source.kind != "device")
        self.need("ideal", any(lane.ideal for lane in self.lanes))
        self.need("mix", len(self.lanes) > 1 or self.device.outputs > 0 or len(shared.heard) + len(shared.recording) > 0)
        self.need("listen", self.device.outputs > 0)
        self.need("record", len(shared.recording) > 0)
        guard.put(record, shared.control, self.rate)
        shared.control["gain"], shared.control["mute"], shared.control["counter_channel"] = 1.0, 1, -1

    def check(self, lane: Lane) -> None:
        """RequestError where a lane does not fit those that run."""
        _common([lane, self.lanes[0]])

    @property
    def past_frames(self) -> int:
        """Frames of past input that are kept."""
        return len(self._past)

    def need(self, part: str, needed: bool = True) -> None:
        """Have a part of the step ready, if it is needed."""
        if needed and not self._record[part][0]:
            self._record[part] = compile_part(part)

    def adopt(self, lane: Lane, slot: int) -> None:
        """Give a lane its room, outside the step."""
        recent = self.shared.outputs[slot] if len(self.shared.heard) else None
        added = self.shared.added[slot] if len(self.shared.heard) else None
        lane.allocate(self.block, recent, self.shared.lanes[slot : slot + 1], added)

    @property
    def address(self) -> int:
        """Of the HOST record: what the step, as a callback, takes as its last argument."""
        return int(self._record.ctypes.data)

    @property
    def callback(self) -> int:
        """The address of the compiled step."""
        return self._step.address

    @property
    def frames(self) -> int:
        """How many frames have been run."""
        return int(self._record["frame"][0] - self._record["begins"][0])

    @property
    def begins(self) -> int:
        """What the step counts the first frame as."""
        return int(self._record["begins"][0])

    @property
    def heard(self) -> int:
        """The lane that is heard."""
        return int(self._record["heard_lane"][0])

    @property
    def heard_block(self) -> NDArray[np.float64]:
        """The last block as it is heard (frames, outputs * channels), before the monitor; the next takes its place."""
        if not self._record["mix"][0]:
            return self.lanes[0].output
        return self._heard[: self._shown]

    def step(self, x: NDArray[np.floating] | None, out: NDArray[np.floating] | None = None) -> None:
        """Run one block x (frames, device's inputs), 1.0 = full scale; then each lane's `output` holds what came of it.

        out: (frames, device's outputs) takes what the guard lets through. x None: nothing comes in, `out` says how long.
        Raises RequestError for another shape or more than `block` frames.
        """
        frames = self._frames(x, out)
        contiguous = None if x is None else np.ascontiguousarray(x, self.device.dtype)
        given = None if contiguous is None else contiguous.ctypes.data
        self._step(given, None if out is None else out.ctypes.data, frames, self.address)
        self.show(frames)

    def come_up(self) -> None:
        """Let the monitor come up from its start, from mute or after the guard has shut. The step obeys at its next block."""
        self.shared.come_up()

    def mute(self) -> None:
        """Silence the monitor at once."""
        self.shared.mute()

    def set_monitor(self, gain_db: float) -> None:
        """The monitor's gain, which it moves to by its ramp: at most 0 dB. RequestError above."""
        self.shared.set_monitor(gain_db)

    def show(self, frames: int) -> None:
        """Say how many frames the last block has."""
        self._shown = frames
        for lane in self.lanes:
            lane.show(frames)

    def _frames(self, x: NDArray[np.floating] | None, out: NDArray[np.floating] | None) -> int:
        if x is not None and (x.ndim != 2 or x.shape[1] != self.device.inputs or len(x) > self.block):
            raise RequestError(
                f"A block of shape {x.shape} does not fit this host: (up to {self.block}, {self.device.inputs}) is needed."
            )
        assert x is not None or out is not None, "a block has a length"
        frames = len(x) if x is not None else len(out) if out is not None else 0
        if out is not None:
            assert out.shape == (frames, self.device.outputs), "what goes out is as long as what comes in"
            assert out.dtype == self.device.dtype and out.flags.c_contiguous, "it is what the device takes"
            assert frames <= self.block, "it fits the host"
        return frames


def _common(lanes: Sequence[Lane]) -> tuple[int, int, float]:
    """Channels, outputs and rate of all lanes."""
    channels = {lane.channels for lane in lanes}
    if len(channels) != 1:
        raise RequestError(
            f"A host runs at least one lane, all of one number of channels; these have {sorted(channels)}."
        )
    if len(lanes) > MOST_LANES:
        raise RequestError(f"A host runs at most {MOST_LANES} lanes, not {len(lanes)}.")
    for what, found in (
        ("outputs", {len(lane.realization.outputs) for lane in lanes}),
        ("rates", {lane.realization.rate for lane in lanes}),
    ):
        if len(found) > 1:
            raise RequestError(f"The lanes of a host have one number of {what}; these have {sorted(found)}.")
    return channels.pop(), len(lanes[0].realization.outputs), lanes[0].realization.rate
