"""The standard curves as their analogue networks: zeros and poles in radians a second."""

from collections.abc import Mapping
from dataclasses import dataclass
from math import pi, sqrt

import numpy as np
import numpy.typing as npt

Roots = tuple[complex, ...]


@dataclass(frozen=True)
class Curve:
    """H(s) = k prod(s - z_i) / prod(s - p_i), k such that the gain at `reference_hz` is `reference_db`.

    Complex roots are given with their conjugates. `band_hz`: from where to where the standard states the response.
    """

    zeros: Roots
    poles: Roots
    reference_hz: float
    reference_db: float
    band_hz: tuple[float, float]

    def decibels(self, hertz: npt.ArrayLike) -> npt.NDArray[np.float64]:
        """The gain at frequencies (n,) in Hz; minus infinity where it is 0."""
        at_reference = self._unscaled(np.array([self.reference_hz]))[0]
        return np.asarray(self._unscaled(np.asarray(hertz, np.float64)) - at_reference + self.reference_db)

    def _unscaled(self, hertz: npt.NDArray[np.float64]) -> npt.NDArray[np.float64]:
        s = 2j * np.pi * hertz
        total = np.zeros(hertz.shape)
        with np.errstate(divide="ignore"):
            for zero in self.zeros:
                total += 20 * np.log10(np.abs(s - zero))
            for pole in self.poles:
                total -= 20 * np.log10(np.abs(s - pole))
        return total


def _a_and_c() -> tuple[Curve, Curve]:
    """IEC 61672-1:2013, Annex E, as quoted: f1, f4 of both and f2, f3 of A, from the corners that define them."""
    low, high, middle, at = 10**1.5, 10**3.9, 10**2.45, 1000.0
    d = sqrt(0.5)
    c = low**2 * high**2
    b = (at**2 + c / at**2 - d * (low**2 + high**2)) / (1 - d)
    f1, f4 = (sqrt((-b + sign * sqrt(b * b - 4 * c)) / 2) for sign in (-1, 1))
    f2, f3 = ((3 + sign * sqrt(5)) / 2 * middle for sign in (-1, 1))
    band = (10.0, 20000.0)
    both = (_corner(f1), _corner(f1), _corner(f4), _corner(f4))
    return (
        Curve((0j,) * 4, (*both, _corner(f2), _corner(f3)), at, 0.0, band),
        Curve((0j,) * 2, both, at, 0.0, band),
    )


def _corner(hertz: float) -> complex:
    return complex(-2 * pi * hertz)


def _time(microseconds: float) -> complex:
    return complex(-1e6 / microseconds)


# Rec. ITU-R BS.468-4, Fig. 1a, as quoted: the network's zero and poles, recomputed for this project. The standard's
# tightest row is 6.3 kHz, +12.2 dB: the gain is set there, and 1 kHz is then at -0.017 dB, where 0.5 dB are allowed.
_468 = Curve(
    (0j,),
    (
        *(-25903.70104781628 + 0j, -62675.1700584679 + 0j),
        *(-23615.53521363528 + 36379.90893732929j, -23615.53521363528 - 36379.90893732929j),
        *(-18743.74669072136 + 62460.15645250649j, -18743.74669072136 - 62460.15645250649j),
    ),
    6300.0,
    12.2,
    (31.5, 31500.0),
)


def _phono_replay(subsonic_us: float = 0) -> Curve:
    """IEC 60098, as quoted: 3180, 318 and 75 us; 7950 us (0: none) is the later amendment's high-pass."""
    zeros, poles = [_time(318)], [_time(3180), _time(75)]
    if subsonic_us:
        zeros, poles = [0j, *zeros], [_time(subsonic_us), *poles]
    return Curve(tuple(zeros), tuple(poles), 1000.0, 0.0, (20.0, 20000.0))


def _fm_de_emphasis(time_constant_us: float) -> Curve:
    """Rec. ITU-R BS.450, as quoted: one pole, 50 or 75 us. The modulation ends at 15 kHz."""
    return Curve((), (_time(time_constant_us),), 0.0, 0.0, (30.0, 15000.0))


_A, _C = _a_and_c()

CURVES: Mapping[str, Curve] = {
    "a-weighting": _A,
    "c-weighting": _C,
    "itu-r-468": _468,
    "phono-replay": _phono_replay(),
    "phono-replay, 7950 us": _phono_replay(7950),
    "fm-de-emphasis, 50 us": _fm_de_emphasis(50),
    "fm-de-emphasis, 75 us": _fm_de_emphasis(75),
}
"""Every curve that has an analogue network, its variants apart."""
