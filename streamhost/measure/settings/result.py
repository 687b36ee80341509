"""What the instrument `table` gives."""

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

from streamhost.measure.changes.result import Trace

CURVE: Any = {"curve": True}


@dataclass(frozen=True)
class Setting:
    """One position of the knobs at one rate, and what the realization is there. at: positions by key.

    said: the same in words. noise: predicted, 20 Hz to 20 kHz, the worst output; infinite where an error does not die out, None
    in floating point. headroom: of the word over the L1 norm from the input, the least of all registers, and which; None in
    floating point. deviation: the largest of the response in the band, by coefficient rounding, on a grid of frequencies.
    stability: "stable", "marginal" (a pole on the circle) or "unstable", with the coefficients as stored. refused: why it
    cannot be realized.
    """

    rate_hz: float
    at: Mapping[str, float | tuple[float, ...]]
    said: str
    noise_dbfs: float | None = None
    headroom_db: float | None = None
    headroom_register: str = ""
    deviation_db: float | None = None
    stability: str = ""
    refused: str = ""


@dataclass(frozen=True)
class Turn:
    """One knob turned to the neighbouring position by `keep`, on the constant or the tone where the click is worst.

    at: where the other knobs stand, of those that are turned at all. The figures are those of `Transient`. reason: why the
    state cannot be kept.
    """

    rate_hz: float
    change: str
    at: str
    signal: str
    peak_dbfs: float | None
    click_468_dbfs: float | None
    reason: str = ""


@dataclass(frozen=True)
class Table:
    """The worst of all settings and of all turns between neighbours, and where.

    noise, headroom, deviation: as in `Setting`, of the settings that are stable; deviation here to the last digit. unstable,
    marginal, refused: how many of the settings; turns, not_kept: how many turns there are, and in how many the state cannot be
    kept. click, peak: of the worst turn by each. steps: how the positions were come by. reason: why there are none.
    Curve: trace, of the turn with the worst click.
    """

    settings: int
    noise_dbfs: float | None
    noise_at: str
    headroom_db: float | None
    headroom_register: str
    headroom_at: str
    deviation_db: float | None
    deviation_hz: float | None
    deviation_at: str
    unstable: int
    marginal: int
    refused: int
    turns: int
    not_kept: int
    click_468_dbfs: float | None
    click_at: str
    click_signal: str
    peak_dbfs: float | None
    peak_at: str
    steps: str
    reason: str
    complete: bool
    positions: tuple[Setting, ...]
    worst_turns: tuple[Turn, ...]
    trace: Trace | None = field(default=None, metadata=CURVE, compare=False, repr=False)
