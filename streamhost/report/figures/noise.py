"""Noise spectra, predicted and measured."""

from collections.abc import Iterator
from typing import Any

import numpy as np

from streamhost.measure.bands import HIGHEST, LOWEST
from streamhost.measure.noise_spectrum import averaged, third_octaves
from streamhost.report.chart import Axis, Chart, FloatArray, Line, Points
from streamhost.report.contents import Contents, Lane
from streamhost.report.figure import Figure, Panel, shown_in, with_ghost
from streamhost.report.words import grouped, number

DEEPEST, DEEPEST_HZ = -240.0, 1.0
SPAN, LEAST_SPAN = 140.0, 20.0
PARTS = 24


def figures(contents: Contents) -> Iterator[Figure]:
    """A figure for each output."""
    found = shown_in(contents.lanes, "noise")
    outputs = dict.fromkeys(one.output for _, result in found for one in result.each)
    for output in outputs:
        shown = [(lane, one) for lane, result in found for one in result.each if one.output == output]
        yield _figure(contents, shown)


def _figure(contents: Contents, shown: list[tuple[Lane, Any]]) -> Figure:
    drawn = {lane.number: one for lane, one in shown if _levels(one).size}
    seen = np.concatenate([_levels(one) for one in drawn.values()] or [np.array([-100.0])])
    top = 10.0 * np.ceil(float(seen.max()) / 10.0 + 0.2)
    bottom = min(max(10.0 * np.floor(float(np.percentile(seen, 1)) / 10.0), top - SPAN), top - LEAST_SPAN)
    axis = Axis(bottom, top, "dBFS in 1 Hz", least=DEEPEST, most=top + 20.0)
    charts = {lane.number: _chart(contents, lane, one, axis) for lane, one in shown if lane.number in drawn}
    charts = with_ghost(contents, charts)
    panels = tuple(Panel(lane.short, str(lane.number), charts.get(lane.number),
                         f"no noise figure: {one.reason}" if one.reason else "") for lane, one in shown)
    return Figure(_caption(contents, shown), _method(contents), panels)


def _curves(one: Any) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    """Measured, averaged; predicted at third octaves: frequencies and levels of each."""
    if not len(one.spectrum_hz):
        return (np.zeros(0),) * 4
    thirds = third_octaves(float(one.spectrum_hz[-1]))
    predicted = np.interp(thirds, one.spectrum_hz, one.predicted_spectrum_dbfs)
    return *averaged(one.spectrum_hz, one.measured_spectrum_dbfs, PARTS), thirds, predicted


def _levels(one: Any) -> FloatArray:
    """All that is finite of the curves, in dBFS."""
    _, measured, _, predicted = _curves(one)
    both = np.concatenate((measured, predicted))
    return np.asarray(both[np.isfinite(both)])


def _caption(contents: Contents, shown: list[tuple[Lane, Any]]) -> str:
    said = [(lane.number, f"{number(one.measured_dbfs)} dBFS"
             + (f" (predicted {number(one.predicted_dbfs)})" if one.predicted_dbfs is not None else ""))
            for lane, one in shown if one.measured_dbfs is not None]
    output = f" at {shown[0][1].output}" if shown[0][1].output else ""
    told = f"Noise{output}: {grouped(said)}." if said else f"Noise{output}: no figure."
    best = contents.best
    ghost = f" The thin line is that of {best.number}." if best is not None and any(lane is best for lane, _ in shown) else ""
    return f"{told} The line is measured, lozenges are predicted.{ghost}"


def _method(contents: Contents) -> str:
    return ("Realized minus ideal (the same coefficients, unrounded arithmetic), without its mean, once settled. Spectrum: "
            "power in 1 Hz, averaged over twenty-fourths of an octave. Figures: 20 Hz to 20 kHz. A full-scale sine reads 0 "
            f"dBFS. Predicted by the white model from the diagram, at third octaves. Input: {contents.source}.")


def _chart(contents: Contents, lane: Lane, one: Any, axis: Axis) -> Chart:
    x = Axis(LOWEST, min(HIGHEST, contents.rate / 2.0), "Hz", True, DEEPEST_HZ, contents.rate / 2.0)
    said = (f"Noise of realization {lane.number} against frequency: {number(one.measured_dbfs)} dBFS measured, "
            f"{number(one.predicted_dbfs)} predicted")
    hertz, measured, thirds, predicted = _curves(one)
    return Chart(said, x, axis, (Line("heard", hertz, measured, str(lane.number)), Points("lozenge", thirds, predicted)))
