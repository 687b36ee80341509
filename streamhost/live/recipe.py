"""What an engine is to run: said whole when it starts, so that another one can take its place."""

from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from streamhost.formats import Fixed
from streamhost.host import Change, Device, Guard, Host, Lane
from streamhost.host.carrying import Prepared
from streamhost.host.shared import Shared, layout
from streamhost.host.sources import Source, device, generated, looped
from streamhost.realization import Realization

MOST_WAITING = 256


@dataclass(frozen=True)
class LaneAsked:
    """A lane; with its `ideal` beside it what it adds can be heard. `match`: the gain by which it is heard."""

    realization: Realization
    match: float = 1.0
    ideal: bool = False

    def made(self, channels: int) -> Lane:
        """The lane. Its kernels are compiled by this, or taken from the cache where they have been."""
        metered = isinstance(self.realization.format, Fixed)
        return Lane(self.realization, channels, metered=metered, ideal=self.ideal, match=self.match)


@dataclass(frozen=True, eq=False)
class Input:
    """What comes in: samples (frames, channels) over and over, named `text`, or what `text` generates; "device": the card."""

    text: str
    samples: NDArray[np.float64] | None = None

    def made(self, rate: float, channels: int) -> Source:
        """The source. RequestError for a text that says none."""
        if self.samples is not None:
            return looped(self.samples, self.text)
        return device() if self.text == "device" else generated(self.text, rate, channels)


@dataclass(frozen=True)
class Planned:
    """A change with the state that it carries, prepared by whoever asks for it. `before`: the lane that it is prepared for."""

    change: Change
    before: int
    prepared: Prepared | None = None


@dataclass(frozen=True, eq=False)
class Recipe:
    """Lanes on what comes in, and how the output is guarded; `heard` at first, `begins`: what frames are counted from.

    inputs, outputs: channels of the card. recent, recording: frames of the rings, as `Host` has them.
    """

    lanes: tuple[LaneAsked, ...]
    input: Input
    channels: int
    block: int
    inputs: int = 0
    outputs: int = 2
    guard: Guard = field(default_factory=Guard)
    planned: tuple[Planned, ...] = ()
    recent: int = 0
    recording: int = 0
    heard: int = 0
    begins: int = 0

    @property
    def rate(self) -> float:
        return self.lanes[0].realization.rate

    @property
    def width(self) -> int:
        """Columns of a lane's output."""
        return self.channels * len(self.lanes[0].realization.outputs)

    @property
    def bytes(self) -> int:
        """Of the memory that is shared."""
        return layout(self.width, self.channels, self.recent, self.recording).itemsize

    def shared(self, buffer: Any) -> Shared:
        """Views of that memory."""
        return Shared(self.width, self.channels, self.recent, self.recording, buffer)

    def host(self, lanes: Sequence[Lane], shared: Shared) -> Host:
        """The host with every change planned. RequestError where lanes or changes do not fit."""
        forget_actions(shared)
        host = Host(
            lanes, self.block, device=Device(self.inputs, self.outputs, float32=True),
            source=self.input.made(self.rate, self.channels), guard=self.guard,
            waiting=max(MOST_WAITING, 2 * len(self.planned)), recent=self.recent, recording=self.recording,
            begins=self.begins, shared=shared,
        )
        if self.heard:
            host.plan.change(Change(0, self.heard, "warm"))
        for each in self.planned:
            if each.change.frame >= self.begins:
                plan(host, each)
        return host


def plan(host: Host, planned: Planned) -> None:
    """Plan a change, whose frame is counted as the step counts. RequestError where it cannot be."""
    frame = max(planned.change.frame - host.begins, host.frames)
    given = planned.prepared if host.plan.heard_at(frame) == planned.before else None
    host.plan.change(replace(planned.change, frame=frame), given=given)


def forget_actions(shared: Shared) -> None:
    """Memory that another engine has counted in: a new one begins with no actions."""
    shared.control["published"], shared.control["used"], shared.meters["taken"] = 0, 0, 0
