"""What the command line of `listen` asks for, and what is prepared for it."""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from streamhost.commands.common import at_rate, presets_named
from streamhost.errors import RequestError

if TYPE_CHECKING:
    from streamhost.host.plan import Change
    from streamhost.live.recipe import Input, LaneAsked
    from streamhost.presets import Preset

DEFAULT_SOURCE = "pink"
RECORDING_S = 4.0
CARD = "device"
"""The source that is the card's own input."""


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
    rise_db_per_s: float
    record: str | None
    force: bool
    json_file: str | None
    device: str | None
    input_device: str | None
    latency_ms: float
    python_callback: bool
    counter: int | None
    volume_is_down: bool
    no_page: bool
    no_browser: bool
    port: int


@dataclass(frozen=True)
class Prepared:
    """The presets at their rate and their lanes, which follow what is saved; the changes in order, what comes in."""

    presets: "list[Preset]"
    lanes: "list[LaneAsked]"
    changes: "tuple[Change, ...]"
    input: "Input"
    channels: int

    @property
    def rate(self) -> float:
        return self.lanes[0].realization.rate


def prepare(asked: Asked, *, ideals: bool = False) -> Prepared:
    """All that can be wrong with the request is found here. `ideals`: what lanes add can be heard."""
    from streamhost.host.matching import matching_gains
    from streamhost.host.plan import parse_change
    from streamhost.live.recipe import LaneAsked
    from streamhost.presets.realizing import realize_presets

    presets = presets_named(asked.presets, asked.variations)
    changes = sorted((parse_change(each, len(presets)) for each in asked.changes), key=lambda change: change.frame)
    presets, given, channels = _input(asked, presets)
    realizations = realize_presets(presets, channels)
    gains: Sequence[float] = matching_gains(realizations) if asked.matched else [1.0] * len(realizations)
    lanes = [LaneAsked(each, gain, ideals) for each, gain in zip(realizations, gains, strict=True)]
    return Prepared(presets, lanes, tuple(changes), given, channels)


def _input(asked: Asked, presets: "list[Preset]") -> "tuple[list[Preset], Input, int]":
    from streamhost.live.recipe import Input
    from streamhost.shipped import resolve

    if asked.input is not None and asked.source is not None:
        raise RequestError("--input and --source both say what comes in: give one of them.")
    if asked.input is None:
        rate = presets[0].rate if asked.rate is None else asked.rate
        return [preset.at(rate) for preset in presets], Input(asked.source or DEFAULT_SOURCE), asked.channels
    from streamhost.files import read_all

    samples, info = read_all(resolve(asked.input, "sample"))
    return [at_rate(preset, info, asked.input) for preset in presets], Input(info.path.name, samples), info.channels
