"""Tones: how distortion depends on level, and the spectrum of the one to which most is added."""

from collections.abc import Iterator
from math import isfinite
from typing import Any

import numpy as np

from streamhost.measure.bands import HIGHEST, LOWEST
from streamhost.report.chart import Axis, Chart, FloatArray, Line
from streamhost.report.contents import Contents, Lane
from streamhost.report.figure import Figure, lane_panel, shown_in
from streamhost.report.words import grouped, hertz, number, short

MIDDLE_HZ = 997.0
SPAN = 160.0
STEP = 20.0


def figures(contents: Contents) -> Iterator[Figure]:
    """Level, then spectrum."""
    found = shown_in(contents.lanes, "tone")
    if any(result.settings for _, result in found):
        yield _levels(found)
    worst = [(lane, result) for lane, result in found if result.worst_spectrum is not None and result.worst is not None]
    if worst:
        yield _spectra(contents, worst)


def _method(result: Any) -> str:
    return (f"One Hann window of {result.window_frames:,} frames after {result.wait_frames or 0:,}, in which a tone has a "
            f"whole number of periods; everything from 20 Hz to 20 kHz but the tone. Dither seed {result.seed}.")


def _middle(result: Any) -> list[Any]:
    """Settings of the frequency nearest 997 Hz and of the output to which most is added there, by level."""
    nearest = min((each.hz for each in result.settings), key=lambda hz: abs(hz - MIDDLE_HZ))
    output = result.settings[0].output
    return sorted((each for each in result.settings if each.hz == nearest and each.output == output),
                  key=lambda each: float(each.level_dbfs))


def _levels(found: list[tuple[Lane, Any]]) -> Figure:
    curves = {lane.number: _middle(result) for lane, result in found if result.settings}
    figures_ = [each.thd_n_db for settings in curves.values() for each in settings if each.thd_n_db is not None]
    levels = [each.level_dbfs for settings in curves.values() for each in settings]
    x = Axis(min(levels), max(0.0, max(levels)), "dBFS")
    y = Axis(STEP * np.floor(min(figures_, default=-STEP) / STEP), max(0.0, STEP * np.ceil(max(figures_, default=0.0) / STEP)),
             "THD+N, dB")
    charts = {}
    for lane, _ in found:
        told = [(each.level_dbfs, each.thd_n_db) for each in curves.get(lane.number, []) if each.thd_n_db is not None]
        if told:
            level, ratio = (np.array(each, dtype=np.float64) for each in zip(*told, strict=True))
            charts[lane.number] = Chart(f"THD+N of realization {lane.number} against level, {number(min(ratio))} dB at best",
                                        x, y, (Line("heard", level, ratio, str(lane.number)),))
    said = [(lane.number, f"{number(result.thd_n_db)} dB") for lane, result in found if result.thd_n_db is not None]
    at = found[0][1]
    caption = f"Distortion and noise of a tone of {hertz(next(iter(curves.values()))[0].hz)} against its level."
    if said:
        caption += f" At {short(at.thd_n_level_dbfs)} dBFS and the worst frequency: {grouped(said)}."
    return Figure(caption, _method(at), tuple(
        lane_panel(lane, charts.get(lane.number), result.reason or "no figure") for lane, result in found))


def _spectra(contents: Contents, found: list[tuple[Lane, Any]]) -> Figure:
    x = Axis(LOWEST, min(HIGHEST, contents.rate / 2.0), "Hz", True, 1.0, contents.rate / 2.0)
    tops = [float(_level(result.worst_spectrum.output).max()) for _, result in found]
    top = STEP * np.ceil(max(tops) / STEP + 0.1)
    y = Axis(top - SPAN, top, "dBFS by bin", least=-300.0, most=top + STEP)
    panels = []
    for lane, result in found:
        spectrum = result.worst_spectrum
        seen = spectrum.hertz > 0.0
        lines = (Line("heard", spectrum.hertz[seen], _level(spectrum.output)[seen], str(lane.number)),
                 Line("difference", spectrum.hertz[seen], _level(spectrum.floor)[seen]))
        panels.append(lane_panel(lane, Chart(f"Spectrum of realization {lane.number} on {_tone(result.worst)}", x, y, lines)))
    said = [(lane.number, f"{number(result.added_dbfs)} dBFS to {_tone(result.worst)}") for lane, result in found
            if result.added_dbfs is not None and isfinite(result.added_dbfs)]
    caption = f"The tone to which most is added: {grouped(said)}." if said else "Nothing is added to any tone."
    return Figure(caption, f"{_method(found[0][1])} The thin line is the noise floor.", tuple(panels))


def _tone(setting: Any) -> str:
    return f"{hertz(setting.hz)} at {short(setting.level_dbfs)} dBFS"


def _level(power: FloatArray) -> FloatArray:
    with np.errstate(divide="ignore"):
        return np.asarray(10.0 * np.log10(2.0 * power), dtype=np.float64)
