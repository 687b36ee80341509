"""The elliptic band-pass of order 12: its coefficients rounded, and the noise of its sections in every order."""

import math
from itertools import permutations

import numpy as np
import pytest
from band_pass import elliptic_band_pass, noise_gain
from scipy import signal

from streamhost.filters import Polynomials
from streamhost.structures import build

# Own computation, to ten decimals.
DENOMINATOR = [
    1, -5.2258158439, 16.7847072872, -36.8831934498, 62.3969015615, -82.6537920646, 88.6743188605, -76.4726364287,
    53.4097959907, -29.202122195, 12.2906738827, -3.5376374095, 0.6262814625,
]


# --- coefficient quantization of a 12th-order elliptic band-pass (Oppenheim & Schafer, ch. 6, from memory)


def rounded(values: tuple[float, ...], fraction_bits: int) -> list[float]:
    scale = 2**fraction_bits
    return [round(value * scale) / scale for value in values]


def test_the_band_pass_has_six_sections_and_this_radius() -> None:
    built = build(elliptic_band_pass(), form="direct-1")
    assert [(len(s.b), len(s.a)) for s in built.sections] == [(3, 3)] * 6
    # max |p| = 0.9933361: own computation, to 7 digits.
    assert max(math.sqrt(section.a[2]) for section in built.sections) == pytest.approx(0.9933361, abs=5e-8)


@pytest.mark.parametrize(("bits", "radius"), [(8, 0.99216), (10, 0.99412), (12, 0.99314), (16, 0.99332)])
def test_rounded_sections_stay_stable(bits: int, radius: float) -> None:
    """Section coefficients in [-2, 2): own computation, to 5 digits."""
    tables = [rounded(section.a, bits - 2) for section in build(elliptic_band_pass(), form="direct-1").sections]
    assert max(math.sqrt(a[2]) for a in tables) == pytest.approx(radius, abs=5e-6)


@pytest.mark.parametrize(
    ("bits", "radius"), [(16, 1.10778), (20, 1.02108), (24, 0.99185), (28, 0.99309)]
)
def test_the_rounded_whole_denominator_does_not(bits: int, radius: float) -> None:
    """a with 7 integer bits and the sign: own computation, to 5 digits."""
    built = build(elliptic_band_pass(), form="direct-1", decomposition="whole")
    (section,) = built.sections
    # Given to 10 decimals; the edges of the design behind them are as exact as those here.
    np.testing.assert_allclose(section.a, DENOMINATOR, rtol=0, atol=6e-11)
    assert max(abs(np.roots(rounded(section.a, bits - 8)))) == pytest.approx(radius, abs=2e-5)


# --- the order of the band-pass's sections. Jackson, IEEE AU-18, 1970, and Oppenheim & Schafer state the rules; the figures
# are an own computation, independent of this code: dB of output noise, one rounding a section at its A(z).


@pytest.mark.parametrize(("ordering", "expected"), [("outward", 18.14), ("inward", 11.92)])
def test_the_noise_of_both_orderings_is_the_one_computed_apart(ordering: str, expected: float) -> None:
    built = build(elliptic_band_pass(), form="direct-1", ordering=ordering, scaling="l2")
    # In 0.01 dB, for the filter without its factor of 1.01 (which would add 0.09 dB).
    assert noise_gain(built.sections) == pytest.approx(expected, abs=0.005)


def test_of_all_orderings_the_spread_is_the_one_computed_apart() -> None:
    """Best 10.3 dB, worst 18.28 dB of 720, from samples of |H|^2, so dense that their mean is the power."""
    sections = [
        Polynomials(tuple(v / s.b[0] for v in s.b), s.a) for s in build(elliptic_band_pass(), form="direct-1").sections
    ]
    w = (np.arange(8192) + 0.5) * np.pi / 8192
    a = np.array([np.abs(signal.freqz(1.0, s.a, w)[1]) ** 2 for s in sections])
    h = np.array([np.abs(signal.freqz(s.b, s.a, w)[1]) ** 2 for s in sections])
    gain = elliptic_band_pass().zeros_poles().gain
    total = gain**2 * np.prod(h, axis=0)
    gains = []
    for order in permutations(range(6)):
        done, power = np.ones_like(w), float(np.mean(a[order[-1]]))
        for k in order[:-1]:
            done = done * h[k]
            # What is rounded at section k, whose output is 1 / N_k of the unscaled one, meets the rest times K N_k.
            power += float(np.mean(done) * np.mean(a[k] * total / done))
        gains.append(10 * math.log10(power))
    assert min(gains) == pytest.approx(10.3, abs=0.005)
    assert max(gains) == pytest.approx(18.28, abs=0.005)


# The best of 720 orders and the scaling by peaks, computed likewise, are for the filter without its factor of 1.01.
@pytest.mark.parametrize(("scaling", "best"), [("l2", 10.3), ("linf", 20.63)])
def test_the_quietest_order_is_the_best_of_all_720(scaling: str, best: float) -> None:
    built = build(elliptic_band_pass(), form="direct-1", ordering="quietest", scaling=scaling)
    assert noise_gain(built.sections) == pytest.approx(best, abs=0.006)
    assert (built.ordering, built.scaling) == ("quietest", scaling)


@pytest.mark.parametrize(("ordering", "expected"), [("outward", 21.78), ("inward", 22.59)])
def test_the_noise_of_both_orderings_scaled_by_peaks(ordering: str, expected: float) -> None:
    built = build(elliptic_band_pass(), form="direct-1", ordering=ordering, scaling="linf")
    assert noise_gain(built.sections) == pytest.approx(expected, abs=0.006)
