"""How far rounding the coefficients moved the response from the one that was asked for."""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from math import inf, pi

import numpy as np
from numpy.typing import NDArray

from streamhost.diagram import Diagram
from streamhost.diagram.fan import from_input
from streamhost.diagram.norms import response_to_output
from streamhost.measure.bands import Band
from streamhost.measure.frequencies import FloatArray, breakpoints, refined
from streamhost.measure.levels import decibels
from streamhost.realization import Realization

ComplexArray = NDArray[np.complex128]

JUDGED = 10.0 ** (-40.0 / 20.0)
"""Of the maximum of |H asked|: what is smaller is not judged."""

PARTS = 16
ZOOMS = 6
DIGITS = 6
"""Of the frequency: a maximum is flat, and where exactly it lies is rounding."""


@dataclass(frozen=True)
class Deviation:
    """The largest |20 lg(|H rounded| / |H asked|)| in a band, and where; None with the reason where there is none.

    `leak_db`: the largest |H rounded| where |H asked| lies more than 40 dB below its maximum in the band, relative to
    that maximum; None where it nowhere does.
    """

    db: float | None
    hz: float | None
    leak_db: float | None
    reason: str = ""


def response_deviation(
    realization: Realization, band: Band, outputs: Sequence[int] = (0,), *, zoomed: bool = True
) -> Deviation:
    """Of the coefficients as stored, from the state space; judged where |H asked| is within 40 dB of its maximum.

    H leads to an output, or, of several, to their sum. Seen on a grid of 16 points an interval, intervals being octaves
    and, around each pole, steps that double from half its distance from the circle; the largest deviation of each channel
    is then zoomed in on. Of channels the one that deviates most.
    """
    channels = range(realization.program.diagram.channels)
    found = [_of_channel(Responses(realization, channel, tuple(outputs)), band, zoomed) for channel in channels]
    return max(found, key=lambda deviation: inf if deviation.db is None else deviation.db)


@dataclass(frozen=True)
class Responses:
    """To the sum of some outputs of one channel."""

    realization: Realization
    channel: int
    outputs: tuple[int, ...]

    def magnitudes(self, hertz: FloatArray) -> tuple[FloatArray, FloatArray]:
        """|H asked| and |H rounded|; the latter infinite where the rounded filter does not settle."""
        asked, rounded = self.at(hertz)
        return np.abs(asked), np.abs(rounded)

    def at(self, hertz: FloatArray) -> tuple[ComplexArray, ComplexArray]:
        """H asked and H rounded; the latter infinite where the rounded filter does not settle."""
        filters, diagram = self.realization.filters, self.realization.program.diagram
        filter = filters[min(self.channel, len(filters) - 1)]
        w = 2.0 * pi * hertz / self.realization.rate
        if len(filter.outputs) < len(self.realization.outputs):
            asked = self._of_diagram(self.realization.diagram, w)  # what the form has inside is asked for by the form alone
        else:
            asked = filter.response(hertz)
            asked = asked[list(self.outputs)].sum(axis=0) if asked.ndim > hertz.ndim else asked
        return asked, self._of_diagram(diagram, w)

    def _of_diagram(self, diagram: Diagram, w: FloatArray) -> ComplexArray:
        channel = min(self.channel, diagram.channels - 1)
        with np.errstate(invalid="ignore"):
            return np.asarray(sum(response_to_output(diagram, [diagram.inputs[0]], w, channel, output=output)[:, 0]
                                  for output in self.outputs))

    @property
    def poles(self) -> Iterable[complex]:
        diagram = self.realization.program.diagram
        return from_input(diagram, self.channel, nodes=[diagram.outputs[output] for output in self.outputs]).poles


def _of_channel(responses: Responses, band: Band, zoomed: bool) -> Deviation:
    rate = responses.realization.rate
    low, high = (2.0 * pi * edge / rate for edge in band)
    hertz = np.clip(refined(breakpoints(responses.poles, low, high), PARTS) * rate / (2.0 * pi), *band)
    asked, rounded = responses.magnitudes(hertz)
    if not np.isfinite(rounded).all():
        return Deviation(None, None, None, "with its coefficients rounded the filter is not stable and has no response")
    top = float(asked.max())
    if top == 0.0 or not np.isfinite(top):
        return Deviation(None, None, None, "the filter as asked has no response in the band to compare with")
    judged = asked >= top * JUDGED
    leak = rounded[~judged].max(initial=0.0) / top
    db = np.where(judged, _deviation_db(asked, rounded), -1.0)
    place = int(db.argmax())
    at, most = _zoomed(responses, hertz, place, top) if zoomed else (float(hertz[place]), float(db[place]))
    return Deviation(most, float(f"{at:.{DIGITS}g}"), None if judged.all() else decibels(leak**2))


def _deviation_db(asked: FloatArray, rounded: FloatArray) -> FloatArray:
    with np.errstate(divide="ignore"):
        return np.asarray(np.abs(20.0 * np.log10(rounded) - 20.0 * np.log10(asked)), dtype=np.float64)


def _zoomed(responses: Responses, hertz: FloatArray, worst: int, top: float) -> tuple[float, float]:
    """The frequency and the size of the largest deviation near a point of the grid."""
    low, high = hertz[max(worst - 1, 0)], hertz[min(worst + 1, len(hertz) - 1)]
    at, most = float(hertz[worst]), -inf
    for _ in range(ZOOMS):
        points = np.unique(np.append(np.linspace(low, high, 2 * PARTS + 1), at))
        asked, rounded = responses.magnitudes(points)
        judged = asked >= top * JUDGED
        db = np.where(judged, _deviation_db(asked, rounded), -1.0)
        place = int(db.argmax())
        at, most = float(points[place]), float(db[place])
        low, high = points[max(place - 1, 0)], points[min(place + 1, len(points) - 1)]
    return at, most
