"""What a report is made of: results that were found elsewhere, and the words for how."""

from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import PurePosixPath
from typing import Any

from streamhost.measure.limits import Verdict


@dataclass(frozen=True)
class Sound:
    """An audio file beside the page, and what it is."""

    name: str
    file: PurePosixPath


@dataclass(frozen=True)
class Lane:
    """One realization.

    form: form, decomposition and format; short: what of that tells it from the others. states_limits: its preset does; where
    it does not, `verdicts` holds it against the limits of others. results: of instruments by name. facts: by output, "" of
    the only one, label and text of each figure of the second ledger; what holds for all outputs stands with the first.
    drawing: SVG text. counts: what it costs, in words. sounds: to be listened to; silent: why some are missing.
    """

    number: int
    title: str
    form: str
    short: str
    states_limits: bool
    verdicts: tuple[Verdict, ...]
    results: Mapping[str, Any]
    facts: tuple[tuple[str, Mapping[str, str]], ...]
    drawing: str
    counts: str
    sounds: tuple[Sound, ...] = ()
    silent: tuple[str, ...] = ()

    @property
    def misses(self) -> tuple[Verdict, ...]:
        return tuple(verdict for verdict in self.verdicts if not verdict.meets)

    @property
    def meets(self) -> bool:
        """Whether it keeps the limits it was held against; False where there are none."""
        return bool(self.verdicts) and not self.misses

    @property
    def word(self) -> str:
        """What the ledger says of its own limits."""
        if not self.states_limits:
            return "not asked"
        return "misses" if self.misses else "meets"


@dataclass(frozen=True)
class Table:
    """heads: of columns, each with its unit; cells: texts by row; numeric: whether a column holds numbers."""

    heads: tuple[tuple[str, str], ...]
    cells: tuple[tuple[str, ...], ...]
    numeric: tuple[bool, ...]


@dataclass(frozen=True)
class Section:
    """What an instrument says: tables and sentences in their order."""

    name: str
    parts: tuple[Table | str, ...]


@dataclass(frozen=True)
class Contents:
    """A whole report. heading: what was compared. source: the input in words; command: what made it, to be run again.

    conditions: sentences on signals, seeds and references that hold for all. remarks: what else is to be known. sections:
    what instruments say of a single realization. documents: certificates and what checks them, beside the page. band: in Hz,
    of limits and noise. limit_signal: what limits were checked on.
    """

    heading: str
    lanes: tuple[Lane, ...]
    source: str
    command: str
    version: str
    rate: float
    band: tuple[float, float]
    limit_signal: str
    conditions: tuple[str, ...] = ()
    sections: tuple[Section, ...] = ()
    remarks: tuple[str, ...] = ()
    documents: tuple[PurePosixPath, ...] = ()

    @property
    def best(self) -> Lane | None:
        """Of those that keep all limits, or else of those with fewest misses, the one with least noise; None of one lane."""
        if len(self.lanes) < 2:
            return None
        return min(self.lanes, key=lambda lane: (len(lane.misses), not lane.verdicts, noise_of(lane)))


def noise_of(lane: Lane) -> float:
    """Its noise in dBFS, infinite without a figure."""
    found = lane.results.get("noise")
    level = None if found is None else found.measured_dbfs
    return float("inf") if level is None else float(level)
