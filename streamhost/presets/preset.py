"""What a preset says, once it has been read."""

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Any

from streamhost.errors import RequestError
from streamhost.filters import Filter
from streamhost.formats import Format
from streamhost.presets.bands import Bands, filter_of, filters_of, highest_channel
from streamhost.presets.lines import Lines


@dataclass(frozen=True)
class Source:
    """What a preset was read from: its name as the user gave it, the raw table, the line of each key, what was varied.

    `sought`: its form is one of all, and may turn out not to carry the filter.
    """

    name: str
    table: Mapping[str, Any]
    lines: Lines
    varied: tuple[str, ...] = ()
    sought: bool = False


@dataclass(frozen=True)
class Preset:
    """One realization as a preset states it.

    `rate` in hertz; `designs` holds the filters for each rate that it is stated for. `pairing`, `ordering` and `scaling`
    are None where the preset leaves them to the defaults.
    `limits` holds those keys of [limits] that are stated: numbers, band_hz (a pair in Hz) and mask (a name).
    """

    title: str
    path: Path | None
    rate: float
    designs: Mapping[float, Bands]
    form: str
    decomposition: str
    pairing: str | None
    ordering: str | None
    scaling: str | None
    outputs: str | None
    format: Format
    limits: Mapping[str, object]
    allow_unstable: bool
    source: Source = field(repr=False, compare=False)

    @property
    def rates(self) -> tuple[float, ...]:
        """All rates that it is stated for, in hertz."""
        return tuple(self.designs)

    @property
    def filter(self) -> Filter:
        """What is asked for at `rate`; of channels that differ, that of the first."""
        return filter_of(self.designs[self.rate], 1)

    @property
    def channels(self) -> int:
        """How many channels it tells apart: 1 where all are alike, else at least 2."""
        highest = highest_channel(self.designs[self.rate])
        return max(2, highest) if highest else 1

    def filters(self, channels: int) -> tuple[Filter, ...]:
        """What is asked for in each of so many channels at `rate`, or one filter where all are alike."""
        return filters_of(self.designs[self.rate], channels)

    @property
    def rates_text(self) -> str:
        """'a rate of 48000 Hz', or 'the rates 44100 and 48000 Hz'."""
        *others, last = (f"{each:g}" for each in self.rates)
        return f"the rates {', '.join(others)} and {last} Hz" if others else f"a rate of {last} Hz"

    def at(self, rate: float) -> "Preset":
        """The preset at one of its rates. RequestError for another."""
        if rate not in self.designs:
            raise RequestError(f"{self.source.name}: this preset has {self.rates_text}, and {rate:g} Hz is asked for.")
        return replace(self, rate=float(rate))

    @property
    def own_title(self) -> str:
        """The title without what was varied."""
        return self.title.removesuffix("".join(f", {value}" for value in self.source.varied))
