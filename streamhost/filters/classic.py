"""Classical designs of any order: the analogue prototype through the bilinear transform, kept as zeros and poles.

`order` is the prototype's: a band-pass or band-stop has twice as many poles. The edges are prewarped.

All zeros of these families lie on the unit circle. Where float64 can say so they are put there to the last bit:
a section's numerator is then 1, -2 cos, 1 as it should be, and a structure can see that its outer gains are 1.
"""

from collections.abc import Iterable
from fractions import Fraction
from math import copysign, inf, isfinite, nextafter, sqrt

from streamhost.errors import FilterError
from streamhost.filters.filter import Filter
from streamhost.filters.kind import Kind, Values
from streamhost.filters.parameters import Above, Between, Count, Edges, Parameter, Word
from streamhost.filters.responses import EDGES, RESPONSE, edge_conflicts

NORMS = {"magnitude": "mag", "phase": "phase", "delay": "delay"}
SMALLEST_PART = 2.0**-13
# What the bilinear transform's rounding leaves of a real part that is 0, as at a quarter of the rate.
NOISE = 2.0**-50

Frequencies = float | tuple[float, float]


def butterworth(rate: float, *, response: str, order: int, frequency: Frequencies) -> Filter:
    """-3.01 dB at the edges."""
    from scipy import signal

    return _filter(rate, *signal.butter(order, frequency, _words(response), output="zpk", fs=rate))


def chebyshev_1(rate: float, *, response: str, order: int, frequency: Frequencies, ripple_db: float) -> Filter:
    """-ripple_db at the edges, 0 dB at the highest points of the pass-band."""
    from scipy import signal

    return _filter(rate, *signal.cheby1(order, ripple_db, frequency, _words(response), output="zpk", fs=rate))


def chebyshev_2(rate: float, *, response: str, order: int, frequency: Frequencies, stopband_db: float) -> Filter:
    """-stopband_db first reached at the edges, which are those of the stop-band."""
    from scipy import signal

    return _filter(rate, *signal.cheby2(order, stopband_db, frequency, _words(response), output="zpk", fs=rate))


def elliptic(
    rate: float, *, response: str, order: int, frequency: Frequencies, ripple_db: float, stopband_db: float
) -> Filter:
    """-ripple_db at the edges."""
    from scipy import signal

    design = signal.ellip(order, ripple_db, stopband_db, frequency, _words(response), output="zpk", fs=rate)
    return _filter(rate, *design)


def bessel(rate: float, *, response: str, order: int, frequency: Frequencies, norm: str) -> Filter:
    """What the edges mean is said by `norm`.

    "magnitude": -3.01 dB there. "phase": the asymptotes of the prototype's gain meet there, as a Butterworth filter's
    do. "delay": the prototype's delay at 0 Hz is 1 / (2 pi f), f the prewarped edge. The transform bends the delay: it
    is flat well below half the rate only.
    """
    from scipy import signal

    return _filter(rate, *signal.bessel(order, frequency, _words(response), output="zpk", norm=NORMS[norm], fs=rate))


def _words(response: str) -> str:
    return response.replace("-", "")


def on_circle(root: complex) -> complex:
    """The root moved until |root|^2 rounds to exactly 1, where that turns it by less than 2^-40 radian.

    The larger part stays. The smaller is at most sqrt(1/2), where its neighbours change |root|^2 by less than the
    interval that rounds to 1 is wide, so one of them falls into it. A smaller part below SMALLEST_PART would have
    to move too far: that root stays as it is.
    """
    if root.imag == 0:
        return complex(copysign(1.0, root.real), 0.0)
    larger, smaller = sorted((root.real, root.imag), key=abs, reverse=True)
    if _is_one(larger, smaller) or abs(smaller) < SMALLEST_PART:
        return root
    start = copysign(sqrt((1 - abs(larger)) * (1 + abs(larger))), smaller)
    moved = next(part for part in _around(start, steps=3) if _is_one(larger, part))
    return complex(larger, moved) if larger == root.real else complex(moved, larger)


def _is_one(larger: float, smaller: float) -> bool:
    return float(Fraction(larger) ** 2 + Fraction(smaller) ** 2) == 1.0


def _around(start: float, steps: int) -> list[float]:
    """The value and its neighbours on both sides, nearest first."""
    candidates = [start]
    up = down = start
    for _ in range(steps):
        up, down = nextafter(up, inf), nextafter(down, -inf)
        candidates += [up, down]
    return candidates


def cleaned(root: complex) -> complex:
    """The root without a real part that is rounding only."""
    return complex(0.0 if abs(root.real) < NOISE else root.real, root.imag)


def _filter(rate: float, z: Iterable[complex], p: Iterable[complex], k: float) -> Filter:
    zeros, poles, gain = [cleaned(zero) for zero in z], [cleaned(pole) for pole in p], float(k)
    parts = [part for root in zeros + poles for part in (root.real, root.imag)]
    if not all(map(isfinite, parts)) or not isfinite(gain) or gain == 0:
        raise FilterError(
            "the design leaves the range of float64: "
            "the order is too high for edges so near to each other, to 0 Hz or to half the rate."
        )
    upper = [on_circle(zero) for zero in zeros if zero.imag > 0]
    real = [on_circle(zero) for zero in zeros if zero.imag == 0]
    return Filter.from_zeros_poles([*upper, *(zero.conjugate() for zero in upper), *real], poles, gain, rate=rate)


def _elliptic_conflicts(values: Values) -> list[str]:
    problems = edge_conflicts(values)
    if values["stopband_db"] <= values["ripple_db"]:
        problems.append(
            f"stopband_db is {values['stopband_db']:g}; it must be above ripple_db, {values['ripple_db']:g}"
        )
    return problems


SOURCE = "analogue prototype and bilinear transform with the edges prewarped; Oppenheim & Schafer, ch. 7"

ORDER = Parameter("order", "", "order of the prototype; a band has twice as many poles", Count(1, 64))
# Beyond 25 no one asks for a Bessel filter (common practice), and its poles take long to find.
BESSEL_ORDER = Parameter("order", "", ORDER.meaning, Count(1, 25))
RIPPLE = Parameter("ripple_db", "dB", "ripple in the pass-band", Between(1e-6, 20.0))
STOPBAND = Parameter("stopband_db", "dB", "attenuation in the stop-band", Above(0.0, 300.0))
STOP_EDGES = Parameter("frequency", "Hz", "edge of the stop-band, or two for a band", Edges())
NORM = Parameter("norm", "", "what the edges mean", Word(tuple(NORMS)), default="magnitude")

KINDS = (
    Kind(
        "butterworth",
        "maximally flat, -3.01 dB at the edges",
        SOURCE,
        (RESPONSE, ORDER, EDGES),
        butterworth,
        conflicts=edge_conflicts,
    ),
    Kind(
        "chebyshev-1",
        "equal ripple in the pass-band, -ripple_db at the edges",
        SOURCE,
        (RESPONSE, ORDER, EDGES, RIPPLE),
        chebyshev_1,
        conflicts=edge_conflicts,
    ),
    Kind(
        "chebyshev-2",
        "maximally flat pass-band, equal ripple in the stop-band, whose edges are given",
        SOURCE,
        (RESPONSE, ORDER, STOP_EDGES, STOPBAND),
        chebyshev_2,
        conflicts=edge_conflicts,
    ),
    Kind(
        "elliptic",
        "equal ripple in pass-band and stop-band, the steepest of its order",
        SOURCE,
        (RESPONSE, ORDER, EDGES, RIPPLE, STOPBAND),
        elliptic,
        conflicts=_elliptic_conflicts,
    ),
    Kind(
        "bessel",
        "flattest delay (of the prototype), hardly any overshoot; -3.01 dB at the edges unless norm says otherwise",
        SOURCE,
        (RESPONSE, BESSEL_ORDER, EDGES, NORM),
        bessel,
        conflicts=edge_conflicts,
    ),
)
