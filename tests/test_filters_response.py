"""The frequency response against published tables, closed forms, many digits and an independent evaluation."""

import mpmath
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from levels import decibels
from scipy import signal

from streamhost.errors import FilterError
from streamhost.filters import Filter, design

EPS = float(np.finfo(np.float64).eps)


def exactly(factor_b, factor_a, hertz, rate):
    """B / A in 400 bits, lists in ascending powers of z^-1."""
    with mpmath.workprec(400):
        inverse = mpmath.expjpi(-2 * mpmath.mpf(hertz) / rate)
        return mpmath.polyval(factor_b, inverse, asc=True) / mpmath.polyval(factor_a, inverse, asc=True)


def relative_error(found, wanted):
    return float(abs(mpmath.mpc(complex(found)) - wanted) / abs(wanted))


# Rec. ITU-R BS.1770, Annex 1, Tables 1 and 2 (as quoted); responses computed from them, four decimals.
K_WEIGHTING = [
    [1.53512485958697, -2.69169619940638, 1.19839281085285, 1.0, -1.69065929318241, 0.73248077421585],
    [1.0, -2.0, 1.0, 1.0, -1.99004745483398, 0.99007225036621],
]
K_WEIGHTING_DB = {
    20: (0.0, -13.2754, -13.2754),
    31.5: (0.0, -7.79, -7.79),
    63: (0.0, -2.6639, -2.6639),
    100: (0.0001, -1.1336, -1.1335),
    200: (0.0012, -0.2661, -0.2649),
    400: (0.0203, -0.0351, -0.0148),
    500: (0.0494, -0.0069, 0.0425),
    997: (0.6604, 0.0306, 0.691),
    1000: (0.667, 0.0307, 0.6977),
    2000: (3.0311, 0.0402, 3.0713),
    4000: (3.9255, 0.0425, 3.968),
    8000: (3.9963, 0.0431, 4.0394),
    10000: (3.9987, 0.0432, 4.0419),
    16000: (3.9998, 0.0433, 4.0431),
    20000: (3.9998, 0.0433, 4.0431),
}


@pytest.mark.parametrize("rows", [(0,), (1,), (0, 1)])
def test_k_weighting(rows):
    f = Filter.from_sections([K_WEIGHTING[row] for row in rows], rate=48000)
    column = rows[0] if len(rows) == 1 else 2
    wanted = [row[column] for row in K_WEIGHTING_DB.values()]
    # The table has four decimals.
    assert decibels(f.response(list(K_WEIGHTING_DB))) == pytest.approx(wanted, abs=1e-4)


@pytest.mark.parametrize("response", ["low-pass", "high-pass"])
def test_butterworth_of_order_eight_at_20_hz_follows_its_closed_form(response):
    """|H|^2 = 1 / (1 + (tan(pi f / fs) / tan(pi fc / fs))^(+-16)): the bilinear transform of the prototype.

    A pole is off by 2^-53, its distance from the circle's point about 5e-4 at least: 16 of them make 4e-12 of |H|.
    """
    f = design("butterworth", rate=48000, response=response, order=8, frequency=20)
    hertz = np.array([2.0, 10.0, 19.0, 20.0, 21.0, 40.0, 200.0, 2000.0, 12000.0, 23000.0])
    ratio = np.tan(np.pi * hertz / 48000) / np.tan(np.pi * 20 / 48000)
    wanted = -10 * np.log10(1 + ratio ** (16 if response == "low-pass" else -16))
    assert decibels(f.response(hertz)) == pytest.approx(wanted, abs=1e-9, rel=0)


@pytest.mark.parametrize("hertz", [0.0, 1.0, 20.0, 50.0, 997.0, 12000.0, 12001.0, 23990.0, 24000.0])
def test_zeros_and_poles_against_400_bits(hertz):
    """Sixteen roots, each within 4 roundings of a quotient that is at most 16 here: under 1e-13, 1e-12 dB."""
    f = design("butterworth", rate=48000, response="low-pass", order=8, frequency=20)
    factor = f.factors[0]
    with mpmath.workprec(400):
        inverse = mpmath.expjpi(-2 * mpmath.mpf(hertz) / 48000)
        wanted = mpmath.mpf(factor.gain)
        for zero, pole in zip(factor.zeros, factor.poles, strict=True):
            wanted *= (1 - mpmath.mpc(zero) * inverse) / (1 - mpmath.mpc(pole) * inverse)
    if wanted == 0:
        assert f.response(hertz) == 0
    else:
        assert relative_error(f.response(hertz), wanted) < 1e-13


@pytest.mark.parametrize("hertz", [0.0, 5.0, 20.0, 40.0, 1000.0, 12000.0, 23000.0])
def test_an_expanded_polynomial_of_order_eight_at_20_hz_against_400_bits(hertz):
    """In powers of z^-1 float64 has nothing left here: |A| is 2e-21 and its coefficients' sum 256."""
    b, a = design("butterworth", rate=48000, response="low-pass", order=8, frequency=20).whole()
    f = Filter.from_coefficients(b, a, rate=48000)
    # Twice the 1e-12 that a polynomial is allowed.
    assert relative_error(f.response(hertz), exactly(b, a, hertz, 48000)) < 2e-12


@given(
    st.sampled_from(["low-pass", "high-pass", "notch", "all-pass"]),
    st.floats(1, 23999),
    st.floats(0.1, 100),
    st.floats(0, 24000),
)
def test_a_section_is_evaluated_to_its_condition_about_z_1_or_minus_1(kind, frequency, q, hertz):
    section = design(kind, rate=48000, frequency=frequency, q=q).sections()[0]
    f = Filter.from_sections([[*section.b, *section.a]], rate=48000)
    for coefficients in (section.b, section.a):
        alone = Filter.from_coefficients(coefficients, rate=48000)
        wanted = exactly(coefficients, [1.0], hertz, 48000)
        # Three rounded coefficients, t to some four roundings, twice; three sums: under 16 eps of the terms' sum.
        assert abs(mpmath.mpc(complex(alone.response(hertz))) - wanted) <= 16 * EPS * _terms(coefficients, hertz)
    wanted = f.response(hertz) * Filter.from_coefficients(section.a, rate=48000).response(hertz)
    # One quotient and one product.
    numerator = Filter.from_coefficients(section.b, rate=48000).response(hertz)
    assert abs(wanted - numerator) <= 8 * EPS * abs(numerator)


def _terms(coefficients, hertz):
    """The magnitudes that are added in the expansion about the nearer of z = 1 and z = -1."""
    s = 1 if hertz <= 12000 else -1
    offset = hertz if s == 1 else 24000 - hertz
    t = 2 * np.sin(np.pi * offset / 48000)
    c0, c1, c2 = coefficients[0], s * coefficients[1], coefficients[2]
    return abs(c0 + c1 + c2) + EPS + abs(c1 + 2 * c2) * t + abs(c2) * t**2


def test_an_independent_evaluation_agrees_on_ordinary_filters():
    f = design(
        "elliptic", rate=48000, response="band-pass", order=5, frequency=(2000, 6000), ripple_db=0.5, stopband_db=60
    )
    z, p, k = signal.ellip(5, 0.5, 60, (2000, 6000), "bandpass", output="zpk", fs=48000)
    hertz = np.linspace(100, 23900, 239)
    _, wanted = signal.freqz_sos(signal.zpk2sos(z, p, k), worN=hertz, fs=48000)
    # Float64 in powers of z^-1, some 1e-15 of coefficients up to 4, five sections; -60 dB is 1e-3.
    assert np.max(np.abs(f.response(hertz) - wanted)) < 1e-11
    sections = Filter.from_sections(signal.zpk2sos(z, p, k), rate=48000)
    assert np.max(np.abs(sections.response(hertz) - wanted)) < 1e-11


def test_a_long_finite_response_agrees_with_its_own_sum_in_pass_band_and_at_its_nulls():
    taps = signal.firwin(63, 3000, fs=48000)
    f = Filter.from_coefficients(taps, rate=48000)
    for hertz in (0.0, 1000.0, 3000.0, 8000.0, 20000.0, 24000.0):
        assert relative_error(f.response(hertz), exactly(list(map(float, taps)), [1.0], hertz, 48000)) < 1e-12


section_lists = st.lists(st.floats(-2, 2, allow_subnormal=False), min_size=1, max_size=3)


@given(section_lists, section_lists, st.floats(0, 24000))
def test_the_response_of_a_cascade_is_the_product_of_the_responses(b, c, hertz):
    first, second = Filter.from_coefficients(b, rate=48000), Filter.from_coefficients(c, [1, -0.5], rate=48000)
    both = Filter.cascade([first, second]).response(hertz)
    product = first.response(hertz) * second.response(hertz)
    # One complex product, which numpy rounds in one way or another.
    assert abs(both - product) <= 4 * EPS * abs(product)


def test_a_delay_turns_the_phase_and_nothing_else():
    f = Filter.from_zeros_poles([], [0, 0, 0], 1, rate=48000)
    assert f.response([0.0, 8000.0, 24000.0]) == pytest.approx([1, -1, -1], abs=1e-15)
    assert f.response(6000.0) == Filter.from_coefficients([0, 0, 0, 1], rate=48000).response(6000.0)


def test_the_shape_of_the_frequencies_is_kept():
    f = Filter.from_coefficients([1, 1], rate=48000)
    assert f.response(0.0).shape == ()
    assert f.response(np.zeros((2, 3))).shape == (2, 3)
    assert f.response([]).shape == (0,)


def test_a_response_on_a_pole_is_not_finite():
    assert not np.isfinite(Filter.from_coefficients([1], [1, -1], rate=48000).response(0.0))


@pytest.mark.parametrize("hertz", [-1.0, 24001.0, float("nan"), float("inf"), "low"])
def test_frequencies_outside_the_band_are_refused(hertz):
    with pytest.raises(FilterError, match=r"a response at .* was asked for"):
        Filter.from_coefficients([1], rate=48000).response(hertz)
