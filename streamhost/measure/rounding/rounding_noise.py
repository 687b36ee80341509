"""Noise predicted from the diagram and measured on signals."""

from collections.abc import Callable, Iterator, Mapping
from dataclasses import fields, replace
from math import inf
from typing import Any

import numpy as np
from numpy.typing import NDArray

from streamhost.formats import Fixed, Float
from streamhost.measure.levels import decibels, power_dbfs
from streamhost.measure.limits import limit_band, limit_signal
from streamhost.measure.measuring import Figures, Measured, Measurement
from streamhost.measure.naming import source_name
from streamhost.measure.predicted import source_shares
from streamhost.measure.quasi_peak import quasi_peak_power
from streamhost.measure.rounding.dynamic_range import dynamic_range, tone_hz
from streamhost.measure.rounding.result import DynamicRange, OutputNoise, RoundingNoise, SignalNoise, SourceNoise
from streamhost.program.sources import noise_sources
from streamhost.realization import Realization
from streamhost.signals import sine

FloatArray = NDArray[np.float64]
Report = Callable[[float, str], None]

TONE_DBFS = -20.0
TONE_SECONDS = 5.0
RANGE_SECONDS = 2.0
WHITE, TONE, GIVEN = "white", "tone", "input"


def noise(
    realization: Realization, x: FloatArray | None = None, *, name: str = "", more: Mapping[str, FloatArray] | None = None,
    quick: bool = False, judged_only: bool = False,
    report: Report = lambda share, doing: None,
) -> RoundingNoise:
    """The noise of a realization on a signal (frames, channels), 1.0 = full scale; unless given, `limit_signal`.

    And on a tone of -20 dBFS and on `more` signals by their names, unless `quick`; and the dynamic range, with a tone of
    -60 dBFS. `name`: of the signal. judged_only: nothing but what limits are about.
    """
    first = limit_signal(realization.rate, realization.diagram.channels) if x is None else x
    signals = {name or (WHITE if x is None else GIVEN): first}
    if not (quick or judged_only):
        signals[TONE] = _tone(realization)
        signals.update(more or {})
    course = _Course(realization, report, len(signals) + (not judged_only))
    found = course.first(*next(iter(signals.items())), meters=not judged_only)
    if judged_only:
        return found
    runs: list[SignalNoise] = list(found.runs)
    ranges: list[DynamicRange] = []
    try:
        for name in list(signals)[1:]:
            runs += course.run(name, signals[name])
        ranges += course.ranges()
    except KeyboardInterrupt:
        return replace(found, runs=tuple(runs), dynamic_ranges=tuple(ranges), complete=False)
    return replace(found, runs=tuple(runs), dynamic_ranges=tuple(ranges))


def _tone(realization: Realization) -> FloatArray:
    frames = round(TONE_SECONDS * realization.rate)
    return sine(frames, realization.rate, tone_hz(realization, 0), TONE_DBFS, realization.diagram.channels)


def figures_of(realization: Realization, found: Measured, measurement: Measurement) -> RoundingNoise:
    """What was found of the noise in a run, with its spectra, without the meter of 468 and further signals."""
    several = len(found.outputs) > 1
    each = tuple(_with_spectra(_of_output(realization, figures, figures.name if several else ""), figures, measurement,
                               realization.rate) for figures in found.outputs)
    return _of_run(realization, found, each)


def _of_run(realization: Realization, found: Measured, each: tuple[OutputNoise, ...]) -> RoundingNoise:
    worst = max(each, key=lambda one: inf if one.measured_dbfs is None else one.measured_dbfs)
    return RoundingNoise(
        **_shallow(worst), ideal=found.ideal, estimate=isinstance(realization.format, Float),
        outputs=each if len(each) > 1 else (), runs=tuple(_signal_part(one) for one in each), dynamic_ranges=(),
    )


def _shallow(result: OutputNoise) -> dict[str, Any]:
    return {each.name: getattr(result, each.name) for each in fields(OutputNoise)}


def _signal_part(result: OutputNoise) -> SignalNoise:
    return SignalNoise(**{each.name: getattr(result, each.name) for each in fields(SignalNoise)})


class _Course:
    """Runs of one realization, and how far they are."""

    def __init__(self, realization: Realization, report: Report, parts: int) -> None:
        self._realization, self._report, self._parts, self._done = realization, report, parts, 0
        self._wait = 0

    def first(self, name: str, x: FloatArray, *, meters: bool) -> RoundingNoise:
        found, measurement, differences = self._measure(name, x, keep=meters)
        several = len(found.outputs) > 1
        each = []
        for place, figures in enumerate(found.outputs):
            one = replace(_of_output(self._realization, figures, figures.name if several else ""), signal=name)
            if meters:
                one = self._with_meters(one, figures, measurement, differences[:, place])
            each.append(one)
        return _of_run(self._realization, found, tuple(each))

    def run(self, name: str, x: FloatArray) -> Iterator[SignalNoise]:
        found, _, differences = self._measure(name, x, keep=True)
        for place, figures in enumerate(found.outputs):
            output = figures.name if len(found.outputs) > 1 else ""
            one = _of_signal(figures, output, name)
            yield replace(one, measured_468_quasi_peak_dbfs=_reading(figures, differences[:, place], self._realization.rate))

    def ranges(self) -> Iterator[DynamicRange]:
        """Of each output."""
        realization = self._realization
        frames = round(RANGE_SECONDS * realization.rate)
        for place, name in enumerate(realization.outputs):
            self._report(self._done / self._parts, "dynamic range")
            output = name if len(realization.outputs) > 1 else ""
            yield dynamic_range(realization, place, output, frames, min(self._wait, 4 * frames))

    def _measure(self, name: str, x: FloatArray, *, keep: bool) -> tuple[Measured, Measurement, FloatArray]:
        """What was found, and the differences after the settling time, (frames, outputs, channels), none unless kept."""
        realization = self._realization
        measurement = Measurement(realization, len(x), x.shape[1], limit_band({}, realization.rate))
        differences = []
        for start in range(0, len(x), measurement.block):
            self._report((self._done + start / len(x)) / self._parts, name)
            block = measurement.step(x[start : start + measurement.block])
            if keep:
                differences.append(block.difference)
        self._done += 1
        self._wait = measurement.wait
        kept = np.concatenate(differences)[measurement.wait :] if keep else np.zeros((0, len(realization.outputs), x.shape[1]))
        return measurement.result(), measurement, kept

    def _with_meters(
        self, one: OutputNoise, figures: Figures, measurement: Measurement, difference: FloatArray
    ) -> OutputNoise:
        """The reading of the quasi-peak meter, and spectra."""
        rate = self._realization.rate
        read = replace(one, measured_468_quasi_peak_dbfs=_reading(figures, difference, rate))
        return _with_spectra(read, figures, measurement, rate)


def _with_spectra(one: OutputNoise, figures: Figures, measurement: Measurement, rate: float) -> OutputNoise:
    """In dBFS in 1 Hz, where there is a figure."""
    spectrum = figures.noise.spectrum
    if spectrum is None:
        return one
    hertz = spectrum.frequencies[1:-1]
    predicted = measurement.predicted_density(figures)(2.0 * np.pi * hertz / rate) / (rate / 2.0)
    return replace(one, spectrum_hz=hertz, measured_spectrum_dbfs=_dbfs(spectrum.power[1:-1] / spectrum.spacing),
                   predicted_spectrum_dbfs=_dbfs(predicted))


def _dbfs(power: FloatArray) -> FloatArray:
    with np.errstate(divide="ignore"):
        return np.asarray(10.0 * np.log10(2.0 * power))


def _reading(figures: Figures, difference: FloatArray, rate: float) -> float | None:
    """Of the channels (frames, channels) that the figures are of, their powers averaged."""
    if figures.noise.dbfs is None or figures.noise.excluded:
        return None
    heard = difference if figures.channel is None else difference[:, figures.channel - 1 : figures.channel]
    return power_dbfs(float(np.mean([quasi_peak_power(channel - channel.mean(), rate) for channel in heard.T])))


def _of_signal(figures: Figures, output: str, signal: str) -> SignalNoise:
    measured = figures.noise
    return SignalNoise(
        signal=signal,
        output=output,
        measured_dbfs=measured.dbfs,
        measured_interval_db=measured.interval_db,
        measured_full_dbfs=measured.full_dbfs,
        measured_a_dbfs=measured.a_dbfs,
        measured_468_rms_dbfs=measured.rms_468_dbfs,
        measured_468_quasi_peak_dbfs=None,
        mean_lsb=figures.dc_lsb,
        white_model_holds=figures.white.holds,
        white_model_reason=figures.white.reason,
        excluded_percent=100.0 * measured.excluded,
        reason=measured.reason,
    )


def _of_output(realization: Realization, figures: Figures, name: str) -> OutputNoise:
    predicted, empty = figures.prediction, np.zeros(0)
    return OutputNoise(
        **{each.name: getattr(_of_signal(figures, name, GIVEN), each.name) for each in fields(SignalNoise)},
        predicted_dbfs=predicted.dbfs if predicted is not None else None,
        predicted_full_dbfs=predicted.full_dbfs if predicted is not None else None,
        predicted_a_dbfs=predicted.a_dbfs if predicted is not None else None,
        predicted_468_rms_dbfs=predicted.rms_468_dbfs if predicted is not None else None,
        channel=figures.channel,
        sources=_sources(realization, figures),
        spectrum_hz=empty, measured_spectrum_dbfs=empty, predicted_spectrum_dbfs=empty,
    )


def _sources(realization: Realization, figures: Figures) -> tuple[SourceNoise, ...]:
    predicted = figures.prediction
    if predicted is None or predicted.dbfs is None or not isinstance(realization.format, Fixed):
        return ()
    program, channel = realization.program, (figures.channel or 1) - 1
    output = realization.outputs.index(figures.name)
    shares = source_shares(program, realization.rate, np.array([0.0, np.pi]), channel, output)[0]
    each = [SourceNoise(source_name(program, source), predicted.dbfs + decibels(share), 100.0 * share)
            for source, share in zip(noise_sources(program, channel), shares.tolist(), strict=True) if share > 0.0]
    return tuple(sorted(each, key=lambda one: -one.share_percent))
