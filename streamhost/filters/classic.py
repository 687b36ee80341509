"""Classical designs of any order: the analogue prototype through the bilinear transform, kept as zeros and poles.

All zeros of these families lie on the unit circle. Where float64 can say so they are put there to the last bit:
a section's numerator is then 1, -2 cos, 1 as it should be, and a structure can see that its outer gains are 1.
"""

from collections.abc import Iterable
from fractions import Fraction
from math import copysign, inf, isfinite, nextafter, sqrt

from streamhost.errors import FilterError
from streamhost.filters.filter import Filter

RESPONSES = {"low-pass": "lowpass", "high-pass": "highpass", "band-pass": "bandpass", "band-stop": "bandstop"}
BANDS = ("band-pass", "band-stop")
SMALLEST_PART = 2.0**-13
# What the bilinear transform's rounding leaves of a real part that is 0, as at a quarter of the rate.
NOISE = 2.0**-50

Edges = float | tuple[float, float]


def butterworth(rate: float, *, response: str, order: int, frequency: Edges) -> Filter:
    """-3.01 dB at the edges. `order` is the prototype's: a band-pass or band-stop has twice as many poles."""
    from scipy import signal

    z, p, k = signal.butter(order, frequency, RESPONSES[response], output="zpk", fs=rate)
    return _filter(rate, z, p, k)


def elliptic(
    rate: float, *, response: str, order: int, frequency: Edges, ripple_db: float, stopband_db: float
) -> Filter:
    """-ripple_db at the edges. `order` is the prototype's: a band-pass or band-stop has twice as many poles."""
    from scipy import signal

    z, p, k = signal.ellip(order, ripple_db, stopband_db, frequency, RESPONSES[response], output="zpk", fs=rate)
    return _filter(rate, z, p, k)


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


def _cleaned(root: complex) -> complex:
    return complex(0.0 if abs(root.real) < NOISE else root.real, root.imag)


def _filter(rate: float, z: Iterable[complex], p: Iterable[complex], k: float) -> Filter:
    zeros, poles, gain = [_cleaned(zero) for zero in z], [_cleaned(pole) for pole in p], float(k)
    parts = [part for root in zeros + poles for part in (root.real, root.imag)]
    if not all(map(isfinite, parts)) or not isfinite(gain) or gain == 0:
        raise FilterError(
            "the design leaves the range of float64: "
            "the order is too high for edges so near to each other, to 0 Hz or to half the rate."
        )
    upper = [on_circle(zero) for zero in zeros if zero.imag > 0]
    real = [on_circle(zero) for zero in zeros if zero.imag == 0]
    return Filter.from_zeros_poles([*upper, *(zero.conjugate() for zero in upper), *real], poles, gain, rate=rate)
