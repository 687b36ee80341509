"""What a preset says, once it has been read."""

from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from streamhost.filters import Filter
from streamhost.formats import Format
from streamhost.presets.lines import Lines


@dataclass(frozen=True)
class Source:
    """What a preset was read from: its name as the user gave it, the raw table, the line of each key, what was varied."""

    name: str
    table: Mapping[str, Any]
    lines: Lines
    varied: tuple[str, ...] = ()


@dataclass(frozen=True)
class Preset:
    """One realization as a preset states it.

    `rate` in hertz. `pairing`, `ordering` and `scaling` are None where the preset leaves them to the defaults.
    `limits` holds noise_dbfs and response_deviation_db (numbers) and band_hz (a pair in Hz), those that are stated.
    """

    title: str
    path: Path | None
    rate: float
    filter: Filter
    form: str
    decomposition: str
    pairing: str | None
    ordering: str | None
    scaling: str | None
    format: Format
    limits: Mapping[str, object]
    allow_unstable: bool
    source: Source = field(repr=False, compare=False)

    @property
    def own_title(self) -> str:
        """The title without what was varied."""
        return self.title.removesuffix("".join(f", {value}" for value in self.source.varied))
