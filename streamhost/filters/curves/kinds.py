"""The standard curves as kinds of filter."""

from streamhost.errors import FilterError
from streamhost.filters.curves.analogue import CURVES, Curve, Roots
from streamhost.filters.curves.bands import OCTAVES, THIRD_OCTAVES, octave_band, third_octave_band
from streamhost.filters.curves.bilinear import gained, transformed
from streamhost.filters.curves.fitted import FITTED
from streamhost.filters.curves.fitting import RATES, Fitted
from streamhost.filters.curves.k_weighting import k_weighting
from streamhost.filters.curves.names import fm_name, phono_name
from streamhost.filters.filter import Filter
from streamhost.filters.kind import Kind
from streamhost.filters.parameters import Choice, Count, Parameter, Word

BILINEAR, LEAST_SQUARES = "bilinear", "least-squares"


def a_weighting(rate: float, *, fit: str) -> Filter:
    """A of IEC 61672-1, 0 dB at 1 kHz."""
    return _made("a-weighting", rate, fit)


def c_weighting(rate: float, *, fit: str) -> Filter:
    """C of IEC 61672-1, 0 dB at 1 kHz."""
    return _made("c-weighting", rate, fit)


def itu_r_468(rate: float, *, fit: str) -> Filter:
    """The noise weighting of ITU-R BS.468, +12.2 dB at 6.3 kHz, which puts 1 kHz at -0.017 dB."""
    return _made("itu-r-468", rate, fit)


def phono_replay(rate: float, *, subsonic_us: float, fit: str) -> Filter:
    """IEC 60098, 0 dB at 1 kHz."""
    return _made(phono_name(subsonic_us), rate, fit)


def fm_de_emphasis(rate: float, *, time_constant_us: float, fit: str) -> Filter:
    """ITU-R BS.450, 0 dB at 0 Hz."""
    return _made(fm_name(time_constant_us), rate, fit)


def _made(name: str, rate: float, fit: str) -> Filter:
    curve = CURVES[name]
    if fit == BILINEAR:
        return transformed(curve, rate)
    found = FITTED.get((name, rate))
    if found is None:
        raise FilterError(
            f'fit "{LEAST_SQUARES}" is kept for the rates {", ".join(map(str, RATES))} Hz; at {rate:g} Hz '
            f'fit = "{BILINEAR}" is allowed'
        )
    return made_of(found, curve, rate)


def made_of(found: Fitted, curve: Curve, rate: float) -> Filter:
    """The filter of a fit, with the curve's gain at its reference frequency."""
    return gained(_both(found.zeros), _both(found.poles), curve, rate)


def _both(roots: Roots) -> list[complex]:
    return [*roots, *(root.conjugate() for root in roots if root.imag)]


FIT = Parameter(
    "fit",
    "",
    "plain bilinear transform, or least squares on the response",
    Word((BILINEAR, LEAST_SQUARES)),
    default=LEAST_SQUARES,
)
SUBSONIC = Parameter("subsonic_us", "us", "time constant of the high-pass, 0 for none", Choice((0, 7950)), default=0)
TIME_CONSTANT = Parameter("time_constant_us", "us", "time constant", Choice((50, 75)))
OCTAVE = Parameter("frequency", "Hz", "nominal mid-band", Choice(OCTAVES))
THIRD_OCTAVE = Parameter("frequency", "Hz", "nominal mid-band", Choice(THIRD_OCTAVES))
# Order 3 misses class 1 in the bands next to half the rate; `curve_fit` tells where.
BAND_ORDER = Parameter("order", "", "order of the prototype; the band has twice as many poles", Count(1, 12), default=4)

BANDS_SOURCE = "IEC 61260-1:2014, base-ten mid-bands; Butterworth"

KINDS = (
    Kind("a-weighting", "frequency weighting A, 0 dB at 1 kHz", "IEC 61672-1:2013, Annex E", (FIT,), a_weighting),
    Kind("c-weighting", "frequency weighting C, 0 dB at 1 kHz", "IEC 61672-1:2013, Annex E", (FIT,), c_weighting),
    Kind("itu-r-468", "noise weighting, +12.2 dB at 6.3 kHz", "Rec. ITU-R BS.468-4, Fig. 1a", (FIT,), itu_r_468),
    Kind("k-weighting", "loudness weighting, two sections", "Rec. ITU-R BS.1770, Annex 1", (), k_weighting),
    Kind(
        "phono-replay",
        "replay of records, 3180, 318 and 75 us, 0 dB at 1 kHz",
        "IEC 60098",
        (SUBSONIC, FIT),
        phono_replay,
    ),
    Kind(
        "fm-de-emphasis",
        "replay of frequency modulation, 0 dB at 0 Hz",
        "Rec. ITU-R BS.450",
        (TIME_CONSTANT, FIT),
        fm_de_emphasis,
    ),
    Kind("octave-band", "passes an octave, -3.01 dB at its edges", BANDS_SOURCE, (OCTAVE, BAND_ORDER), octave_band),
    Kind(
        "third-octave-band",
        "passes a third of an octave, -3.01 dB at its edges",
        BANDS_SOURCE,
        (THIRD_OCTAVE, BAND_ORDER),
        third_octave_band,
    ),
)
