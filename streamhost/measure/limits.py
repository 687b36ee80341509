"""The limits that a preset can state, and whether a realization keeps them, on a signal that is always the same."""

from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass
from math import inf
from typing import Any

import numpy as np
from numpy.typing import NDArray

from streamhost.measure.bands import Band, audio_band
from streamhost.realization import Realization

SEED = 1
SECONDS = 10.0
PEAK_DBFS = -20.0

AT_MOST, AT_LEAST = "at most", "at least"


@dataclass(frozen=True)
class Verdict:
    """One limit: its key, what was found (None: no figure, for that reason), what is allowed, and their unit.

    `rule`: whether that is allowed at most or at least. `output`: of which of several. `about`: of what, where the key
    alone does not tell.
    """

    key: str
    found: float | None
    allowed: float
    unit: str
    reason: str = ""
    output: str = ""
    rule: str = AT_MOST
    about: str = ""

    @property
    def meets(self) -> bool:
        if self.found is None:
            return False
        return self.found >= self.allowed if self.rule == AT_LEAST else self.found <= self.allowed


@dataclass(frozen=True)
class Finding:
    """The figure that a limit is about, or the reason why there is none, of which of several outputs, and of what."""

    figure: float | None
    reason: str = ""
    output: str = ""
    about: str = ""


@dataclass(frozen=True)
class Limit:
    """A key of [limits], the unit of its figure, and where the figure is found.

    `instrument`: the name of the one whose result `find` is given; without, it is given the realization. `threshold`: what
    is allowed, where a preset states no number.
    """

    key: str
    unit: str
    instrument: str
    find: Callable[[Any], Iterator[Finding]]
    rule: str = AT_MOST
    threshold: float | None = None


def _noise(result: Any) -> Iterator[Finding]:
    for each in result.each:
        yield Finding(each.measured_dbfs, each.reason, each.output)


def _deviation(result: Any) -> Iterator[Finding]:
    for each in result.bands:
        yield Finding(each.deviation_db, each.reason, each.output)


def _leak(result: Any) -> Iterator[Finding]:
    """A filter that is nowhere 40 dB down leaks nothing."""
    for each in result.bands:
        yield Finding(-inf if each.leak_db is None and not each.reason else each.leak_db, each.reason, each.output)


def _mask(result: Any) -> Iterator[Finding]:
    for each in result.masks:
        band = f" about {each.nominal_hz:g} Hz" if each.nominal_hz is not None else ""
        at = f", nearest to its edge at {each.margin_hz:g} Hz" if each.margin_hz is not None else ""
        yield Finding(each.margin_db, each.reason, each.output, f"{each.mask}{band}{at}")


def _headroom(result: Any) -> Iterator[Finding]:
    yield Finding(result.headroom_db, about=result.headroom_register)


def _thd_n(result: Any) -> Iterator[Finding]:
    if not result.judged:
        yield Finding(None, result.reason)
    for each in result.judged:
        yield Finding(each.thd_n_db, each.reason, each.output, f"at {each.hz:.1f} Hz and {each.level_dbfs:g} dBFS")


def _limit_cycle(result: Any) -> Iterator[Finding]:
    """The largest there is, where that is proven; else the largest found, overflow oscillations among them."""
    found = [each for each in (result.found_lsb, result.overflow_lsb, result.ended_lsb) if each is not None]
    if result.proven_lsb is not None:
        found = [*(each for each in (result.overflow_lsb, result.ended_lsb) if each is not None), result.proven_lsb]
    about = "proven" if result.proven_lsb is not None else "the largest found, which is no proof"
    yield Finding(float(max(found)), about=about) if found else Finding(None, result.reason)


def _transient(result: Any) -> Iterator[Finding]:
    yield Finding(result.peak_dbfs, result.reason, about=_change(result))


def _click(result: Any) -> Iterator[Finding]:
    yield Finding(result.click_468_dbfs, result.reason, about=_change(result))


def _change(result: Any) -> str:
    return f"{result.change} by {result.changeover}" if result.change else ""


def _counted(count: Callable[[Realization], int]) -> Callable[[Realization], Iterator[Finding]]:
    return lambda realization: iter([Finding(float(count(realization)))])


LIMITS = (
    Limit("noise_dbfs", "dBFS", "noise", _noise),
    Limit("response_deviation_db", "dB", "response", _deviation),
    Limit("leak_db", "dB", "response", _leak),
    Limit("mask", "dB inside", "response", _mask, AT_LEAST, threshold=0.0),
    Limit("headroom_db", "dB", "overflow", _headroom, AT_LEAST),
    Limit("limit_cycle_lsb", "LSB", "limit_cycles", _limit_cycle),
    Limit("thd_n_db", "dB", "tone", _thd_n),
    Limit("transient_dbfs", "dBFS", "transients", _transient),
    Limit("click_dbfs", "dBFS", "transients", _click),
    Limit("multiplications", "", "", _counted(lambda each: each.program.drawn.counts().multiplications)),
    Limit("memory_words", "words", "", _counted(lambda each: each.program.drawn.counts().delays)),
)
"""Every limit, in the order in which they are told. Its type in a preset stands in `presets.tables.LimitsTable`."""


def limit_band(limits: Mapping[str, object], rate: float) -> Band:
    """The band of the response: as stated, else 20 Hz to 20 kHz, or all there is where half the rate is below that."""
    stated = limits.get("band_hz")
    if isinstance(stated, tuple):
        return float(stated[0]), float(stated[1])
    return audio_band(rate) or (0.0, rate / 2.0)


def limit_signal(rate: float, channels: int = 1) -> NDArray[np.float64]:
    """White noise, uniform, peak -20 dBFS, 10 s, seed 1: busy, and with headroom as a programme has it.

    One channel is enough, unless channels have coefficients of their own.
    """
    from streamhost.signals import white

    return white(round(SECONDS * rate), channels, SEED, PEAK_DBFS)


def stated_limits(limits: Mapping[str, object]) -> tuple[Limit, ...]:
    """Those of LIMITS that a preset states."""
    return tuple(limit for limit in LIMITS if limit.key in limits)


def verdicts(
    limits: Mapping[str, object], realization: Realization, result_of: Callable[[str], Any]
) -> tuple[Verdict, ...]:
    """Each stated limit against what was found, at each output.

    `result_of` gives the result of an instrument by its name, on `limit_signal` and over `limit_band`; it is called only
    for those that a stated limit asks for.
    """
    found = []
    for limit in stated_limits(limits):
        subject = result_of(limit.instrument) if limit.instrument else realization
        allowed = limits[limit.key] if limit.threshold is None else limit.threshold
        assert isinstance(allowed, float | int), "the preset's table says so"
        found += [Verdict(limit.key, each.figure, float(allowed), limit.unit, each.reason, each.output, limit.rule, each.about)
                  for each in limit.find(subject)]
    return tuple(found)
