"""Second-order sections by the formulas of the W3C Audio Working Group Note "Audio EQ Cookbook" (2021).

Computed in float64 as the formulas stand; b and a are then divided by a0, each quotient rounded once.
"""

from math import cos, inf, isfinite, log, pi, sin, sinh, sqrt

from streamhost.errors import FilterError
from streamhost.filters.filter import Filter
from streamhost.filters.kind import Kind, Values
from streamhost.filters.parameters import Above, Between, Frequency, Parameter

Triple = tuple[float, float, float]


def low_pass(rate: float, *, frequency: float, q: float) -> Filter:
    c, alpha = _angle(rate, frequency, q)
    return _section(rate, ((1 - c) / 2, 1 - c, (1 - c) / 2), (1 + alpha, -2 * c, 1 - alpha))


def high_pass(rate: float, *, frequency: float, q: float) -> Filter:
    c, alpha = _angle(rate, frequency, q)
    return _section(rate, ((1 + c) / 2, -(1 + c), (1 + c) / 2), (1 + alpha, -2 * c, 1 - alpha))


def band_pass(rate: float, *, frequency: float, q: float) -> Filter:
    c, alpha = _angle(rate, frequency, q)
    return _section(rate, (alpha, 0.0, -alpha), (1 + alpha, -2 * c, 1 - alpha))


def notch(rate: float, *, frequency: float, q: float) -> Filter:
    c, alpha = _angle(rate, frequency, q)
    return _section(rate, (1.0, -2 * c, 1.0), (1 + alpha, -2 * c, 1 - alpha))


def all_pass(rate: float, *, frequency: float, q: float) -> Filter:
    c, alpha = _angle(rate, frequency, q)
    return _section(rate, (1 - alpha, -2 * c, 1 + alpha), (1 + alpha, -2 * c, 1 - alpha))


def peak(
    rate: float, *, frequency: float, gain_db: float, q: float | None = None, bandwidth: float | None = None
) -> Filter:
    """`bandwidth` in octaves between the points at half the gain in decibels."""
    w0 = 2 * pi * frequency / rate
    c, big_a = _cosine(rate, frequency), 10 ** (gain_db / 40)
    if q is not None:
        alpha = _alpha_of_q(w0, q)
    else:
        assert bandwidth is not None
        alpha = _alpha_of_bandwidth(w0, bandwidth)
    b = (1 + alpha * big_a, -2 * c, 1 - alpha * big_a)
    return _section(rate, b, (1 + alpha / big_a, -2 * c, 1 - alpha / big_a))


def low_shelf(
    rate: float, *, frequency: float, gain_db: float, q: float | None = None, slope: float | None = None
) -> Filter:
    c, big_a, width = _shelf(rate, frequency, gain_db, q, slope)
    above, below = big_a + 1, big_a - 1
    b = (
        big_a * (above - below * c + width),
        2 * big_a * (below - above * c),
        big_a * (above - below * c - width),
    )
    a = (above + below * c + width, -2 * (below + above * c), above + below * c - width)
    return _section(rate, b, a)


def high_shelf(
    rate: float, *, frequency: float, gain_db: float, q: float | None = None, slope: float | None = None
) -> Filter:
    c, big_a, width = _shelf(rate, frequency, gain_db, q, slope)
    above, below = big_a + 1, big_a - 1
    b = (
        big_a * (above + below * c + width),
        -2 * big_a * (below + above * c),
        big_a * (above + below * c - width),
    )
    a = (above - below * c + width, 2 * (below - above * c), above - below * c - width)
    return _section(rate, b, a)


def steepest_slope(gain_db: float) -> float:
    """The shelf slope from which on the formulas have no real solution; infinite where there is none."""
    big_a = 10 ** (gain_db / 40)
    excess = big_a + 1 / big_a - 2
    return 1 + 2 / excess if excess > 0 else inf


def _angle(rate: float, frequency: float, q: float) -> tuple[float, float]:
    w0 = 2 * pi * frequency / rate
    return _cosine(rate, frequency), _alpha_of_q(w0, q)


def _cosine(rate: float, frequency: float) -> float:
    # cos(pi / 2) in float64 is 6e-17: a coefficient that rounding to a word would make vanish. 0 is none.
    return 0.0 if frequency == rate / 4 else cos(2 * pi * frequency / rate)


def _alpha_of_q(w0: float, q: float) -> float:
    return sin(w0) / (2 * q)


def _alpha_of_bandwidth(w0: float, bandwidth: float) -> float:
    try:
        return sin(w0) * sinh(log(2) / 2 * bandwidth * w0 / sin(w0))
    except OverflowError:
        return inf


def _shelf(
    rate: float, frequency: float, gain_db: float, q: float | None, slope: float | None
) -> tuple[float, float, float]:
    """cos(w0), A, and 2 sqrt(A) alpha."""
    w0, big_a = 2 * pi * frequency / rate, 10 ** (gain_db / 40)
    if q is not None:
        alpha = _alpha_of_q(w0, q)
    else:
        assert slope is not None
        alpha = sin(w0) / 2 * sqrt((big_a + 1 / big_a) * (1 / slope - 1) + 2)
    return _cosine(rate, frequency), big_a, 2 * sqrt(big_a) * alpha


def _section(rate: float, b: Triple, a: Triple) -> Filter:
    if not all(map(isfinite, b + a)):
        raise FilterError(
            "the formulas give no finite coefficients for these parameters: "
            "the pass-band or the bell is too wide, or the frequency too near half the rate."
        )
    return Filter.from_coefficients(b, a, rate=rate)


def _slope_conflicts(values: Values) -> list[str]:
    if "slope" not in values:
        return []
    limit = steepest_slope(values["gain_db"])
    if values["slope"] < limit:
        return []
    return [f"slope is {values['slope']:g}; at {values['gain_db']:g} dB it must be below {limit:g}"]


SOURCE = "W3C Audio Working Group Note, Audio EQ Cookbook, 2021"

FREQUENCY = Parameter("frequency", "Hz", "cut-off or centre", Frequency())
Q = Parameter("q", "", "quality factor", Above(0.0))
FLAT_Q = Parameter("q", "", "quality factor; 1/sqrt(2) is maximally flat", Above(0.0), default=1 / sqrt(2))
# A factor of a million: no equalizer asks for more (common practice), and a larger figure is most often
# a frequency or a factor in the wrong place.
GAIN = Parameter("gain_db", "dB", "gain at the centre or on the shelf", Between(-120.0, 120.0))
# Ten octaves is 20 Hz to 20 kHz.
BANDWIDTH = Parameter("bandwidth", "octaves", "between the points at half the gain in dB", Above(0.0, 10.0))
SLOPE = Parameter("slope", "", "shelf slope, 1 the steepest without overshoot", Above(0.0))

KINDS = (
    Kind("low-pass", "passes below the frequency", SOURCE, (FREQUENCY, FLAT_Q), low_pass),
    Kind("high-pass", "passes above the frequency", SOURCE, (FREQUENCY, FLAT_Q), high_pass),
    Kind("band-pass", "passes about the frequency, 0 dB there", SOURCE, (FREQUENCY, Q), band_pass),
    Kind("notch", "takes the frequency out", SOURCE, (FREQUENCY, Q), notch),
    Kind("all-pass", "turns the phase, 180 degrees at the frequency", SOURCE, (FREQUENCY, Q), all_pass),
    Kind(
        "peak",
        "raises or lowers a bell about the frequency",
        SOURCE,
        (FREQUENCY, GAIN, Q, BANDWIDTH),
        peak,
        alternatives=("q", "bandwidth"),
    ),
    Kind(
        "low-shelf",
        "raises or lowers what is below the frequency, half the gain there",
        SOURCE,
        (FREQUENCY, GAIN, Q, SLOPE),
        low_shelf,
        alternatives=("q", "slope"),
        conflicts=_slope_conflicts,
    ),
    Kind(
        "high-shelf",
        "raises or lowers what is above the frequency, half the gain there",
        SOURCE,
        (FREQUENCY, GAIN, Q, SLOPE),
        high_shelf,
        alternatives=("q", "slope"),
        conflicts=_slope_conflicts,
    ),
)
