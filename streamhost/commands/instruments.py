"""The instruments of `measure`, and how limits are checked with them."""

import json
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from streamhost import measure
from streamhost.commands.measuring import float_, limit_cycles, noise, overflow, response, table, tone, transients
from streamhost.commands.measuring.wave import Wave
from streamhost.measure.bands import Band
from streamhost.measure.limits import Verdict, limit_band, limit_signal, verdicts
from streamhost.presets import Preset
from streamhost.realization import Realization

RECORDING = "chord"
"""In which noise is measured too: mono, quiet, and it fades to silence."""

CHANGED = "plucked"
"""What changes are tried on, sample by sample whatever the rate, unless the user gives a recording."""

CHANGEOVER_MS = 20.0
"""Of fades and ramps, unless the preset's limits say."""

Report = Callable[[float, str], None]


def unheard(share: float, doing: str) -> None:
    """A report that goes nowhere."""


@dataclass(frozen=True)
class Asked:
    """What an instrument is to measure, and how. x: the signal, (frames, channels), 1.0 = full scale; `heard`: its name.

    given: it is the user's, and not the one for limits.
    """

    preset: Preset
    realization: Realization
    x: NDArray[np.float64]
    band: Band
    quick: bool = False
    report: Report = unheard
    heard: str = "white"
    given: bool = False


@dataclass(frozen=True)
class Document:
    """A text that belongs to a result, for a file of that name behind the preset's: "certificate.json"."""

    name: str
    text: str


def _no_waves(result: Any) -> Iterator[Wave]:
    return iter(())


def _no_documents(result: Any) -> Iterator[Document]:
    return iter(())


@dataclass(frozen=True)
class Instrument:
    """`name`: its key in JSON. `run`: its result, a frozen dataclass. `lines`: what that says. `waves`: audio in it.

    `documents`: texts in it. `seconds`: about what it takes, for the progress line. `judged`: a run that gives the figures of
    its limits and no more, where that is less work. `quick_judges`: a quick run gives the same figures for its limits.
    """

    name: str
    run: Callable[[Asked], Any]
    lines: Callable[[Any], Iterator[str]]
    waves: Callable[[Any], Iterator[Wave]] = _no_waves
    documents: Callable[[Any], Iterator[Document]] = _no_documents
    seconds: float = 1.0
    judged: Callable[[Asked], Any] | None = None
    quick_judges: bool = False


def _response(asked: Asked, *, judged_only: bool = False) -> measure.Response:
    limits: Mapping[str, Any] = asked.preset.limits
    masks = [limits["mask"]] if "mask" in limits else []
    return measure.response(asked.realization, [asked.band], masks, mask_hz=limits.get("mask_hz"), judged_only=judged_only)


def _noise(asked: Asked) -> measure.RoundingNoise:
    """On the signal, a tone and, at its rate, a shipped recording."""
    from streamhost.files import probe, read_all
    from streamhost.shipped import resolve

    path = resolve(RECORDING, "sample")
    fits = not asked.quick and asked.realization.rate == probe(path).rate
    more = {RECORDING: np.repeat(read_all(path)[0], asked.realization.diagram.channels, axis=1)} if fits else {}
    return measure.noise(asked.realization, asked.x, name=asked.heard, more=more, quick=asked.quick, report=asked.report)


def _overflow(asked: Asked) -> measure.Overflow:
    return measure.overflow(asked.realization, asked.x, quick=asked.quick, report=asked.report)


def _transients(asked: Asked, *, judged_only: bool = False) -> measure.Transients:
    """On the user's recording or a shipped one: noise hides what a change does."""
    from streamhost.files import read_all
    from streamhost.measure.changes import form_targets, parameter_targets
    from streamhost.shipped import resolve

    limits: Mapping[str, Any] = asked.preset.limits
    steps = (1,) if asked.quick and not judged_only else (1, -1)
    targets = parameter_targets(asked.preset, asked.realization, steps=steps)
    return measure.transients(
        asked.realization, asked.x if asked.given else read_all(resolve(CHANGED, "sample"))[0],
        targets=targets if judged_only else [*targets, *form_targets(asked.realization)],
        changeover=limits.get("changeover", "keep"), over_ms=limits.get("changeover_ms", CHANGEOVER_MS), quick=asked.quick,
        judged_only=judged_only, report=asked.report,
    )


def _tone(asked: Asked) -> measure.Tones:
    return measure.tone(asked.realization, quick=asked.quick, report=asked.report)


def _certificate(result: measure.LimitCycles) -> Iterator[Document]:
    """What was proven, and the script that checks it again."""
    from streamhost.measure.cycles.certificate import certificate, script

    if result.sections:
        yield Document("certificate.json", json.dumps(certificate(result), indent=1) + "\n")
        yield Document("recheck.py", script())


INSTRUMENTS = (
    Instrument("response", _response, response.lines, judged=lambda asked: _response(asked, judged_only=True),
               quick_judges=True),
    Instrument("noise", _noise, noise.lines, seconds=4.0,
               judged=lambda asked: measure.noise(asked.realization, asked.x, judged_only=True), quick_judges=True),
    Instrument("overflow", _overflow, overflow.lines, overflow.waves, seconds=2.0,
               judged=lambda asked: measure.overflow(asked.realization, judged_only=True), quick_judges=True),
    Instrument(
        "limit_cycles", lambda asked: measure.limit_cycles(asked.realization, quick=asked.quick, report=asked.report),
        limit_cycles.lines, limit_cycles.waves, _certificate, seconds=10.0,
    ),
    Instrument("transients", _transients, transients.lines, transients.waves, seconds=8.0,
               judged=lambda asked: _transients(asked, judged_only=True)),
    Instrument("table", lambda asked: measure.table(asked.preset, quick=asked.quick, report=asked.report), table.lines,
               table.waves, seconds=12.0),
    Instrument("tone", _tone, tone.lines, waves=tone.waves, seconds=4.0,
               judged=lambda asked: measure.tone(asked.realization, [], idle=False)),
    Instrument("float", lambda asked: measure.float_particulars(asked.realization, quick=asked.quick, report=asked.report),
               float_.lines, seconds=1.5),
)
"""In the order in which they run and are told."""


def limit_verdicts(preset: Preset, realization: Realization, known: dict[str, Any] | None = None) -> tuple[Verdict, ...]:
    """Whether a realization keeps its preset's limits. `known`: results that were already found, on the signal for limits."""
    results = {} if known is None else dict(known)
    instruments = {instrument.name: instrument for instrument in INSTRUMENTS}
    asked: list[Asked] = []

    def result_of(name: str) -> Any:
        if name not in results:
            if not asked:
                asked.append(asked_for_limits(preset, realization))
            instrument = instruments[name]
            results[name] = (instrument.judged or instrument.run)(asked[0])
        return results[name]

    return verdicts(preset.limits, realization, result_of)


def asked_for_limits(preset: Preset, realization: Realization, *, quick: bool = False) -> Asked:
    """What limits are checked on."""
    x = limit_signal(realization.rate, realization.diagram.channels)
    return Asked(preset, realization, x, limit_band(preset.limits, realization.rate), quick)
