"""Octave and third-octave bands of IEC 61260-1:2014: base-ten mid-bands, edges half a band away from them."""

from math import log10

from streamhost.errors import FilterError
from streamhost.filters.classic import butterworth
from streamhost.filters.filter import Filter

OCTAVE_RATIO = 10**0.3
REFERENCE_HZ = 1000.0

THIRD_OCTAVES = (
    *(10.0, 12.5, 16.0, 20.0, 25.0, 31.5, 40.0, 50.0, 63.0, 80.0, 100.0, 125.0, 160.0, 200.0, 250.0, 315.0, 400.0),
    *(500.0, 630.0, 800.0, 1000.0, 1250.0, 1600.0, 2000.0, 2500.0, 3150.0, 4000.0, 5000.0, 6300.0, 8000.0, 10000.0),
    *(12500.0, 16000.0, 20000.0),
)
"""Nominal mid-bands; the n-th is 10^(1 + n / 10) Hz exactly."""

OCTAVES = THIRD_OCTAVES[2::3]


def exact_hz(nominal_hz: float) -> float:
    """The exact mid-band of a nominal one: the power of 10^0.1 next to it."""
    return float(10 ** (round(10 * log10(nominal_hz)) / 10))


def band_edges(nominal_hz: float, bands_per_octave: int) -> tuple[float, float]:
    """Lower and upper edge in Hz."""
    half = OCTAVE_RATIO ** (0.5 / bands_per_octave)
    return exact_hz(nominal_hz) / half, exact_hz(nominal_hz) * half


def octave_band(rate: float, *, frequency: float, order: int) -> Filter:
    """A Butterworth band-pass with its edges on those of the octave."""
    return _band(rate, frequency, order, 1)


def third_octave_band(rate: float, *, frequency: float, order: int) -> Filter:
    """A Butterworth band-pass with its edges on those of the third of an octave."""
    return _band(rate, frequency, order, 3)


def _band(rate: float, nominal_hz: float, order: int, bands_per_octave: int) -> Filter:
    edges = band_edges(nominal_hz, bands_per_octave)
    if edges[1] >= rate / 2:
        raise FilterError(f"the upper edge of the band is {edges[1]:g} Hz; it must be below half the rate, {rate / 2:g}.")
    return butterworth(rate, response="band-pass", order=order, frequency=edges)
