"""Filter: what it is made from, what it refuses, and its other descriptions."""

from fractions import Fraction

import numpy as np
import pytest

from streamhost.errors import FilterError
from streamhost.filters import Filter, Polynomials, ZerosPoles, design


def test_coefficients_are_divided_by_a0_and_rounded_once():
    f = Filter.from_coefficients([1, 2, 0], [3, 1, 0, 0], rate=48000)
    assert f.factors == (Polynomials((1 / 3, 2 / 3), (1.0, 1 / 3)),)
    assert f.rate == 48000.0


def test_exact_numbers_stay_exact_until_they_are_divided():
    """0.1 rounded and then divided would be 0.1 / 0.3 = 0.33333333333333337."""
    f = Filter.from_coefficients([Fraction(1, 10)], [Fraction(3, 10)], rate=48000)
    assert f.sections()[0].b == (1 / 3,)


@pytest.mark.parametrize(
    "b", [(0.5, 0.25), [0.5, 0.25], np.array([0.5, 0.25]), np.float32([0.5, 0.25]), iter([0.5, 0.25])]
)
def test_lists_of_every_sort_are_taken(b):
    assert Filter.from_coefficients(b, rate=np.int32(48000)).sections()[0].b == (0.5, 0.25)


def test_a_zero_numerator_is_a_filter():
    f = Filter.from_coefficients([0, 0], [1, -0.5], rate=48000)
    assert f.whole() == ((0.0,), (1.0, -0.5))
    assert f.zeros_poles() == ZerosPoles((), (0.5 + 0j,), 0.0)
    assert f.response(100.0) == 0


def test_second_order_coefficients_are_a_section_and_higher_ones_are_not():
    assert Filter.from_coefficients([1, 2, 1, 0], [1, 0, 0.5], rate=48000).sections_given
    higher = Filter.from_coefficients([1, 0, 0, 1], rate=48000)
    assert not higher.sections_given
    with pytest.raises(FilterError, match="order 3 was not given as sections"):
        higher.sections()


def test_sections_are_kept_as_given_with_a0_divided_out():
    f = Filter.from_sections([[2, 0, 0, 4, 1, 0], [1, -2, 1, 1, 0, 0.5]], rate=48000)
    assert f.sections() == (
        Polynomials((0.5, 0.0, 0.0), (1.0, 0.25, 0.0)),
        Polynomials((1.0, -2.0, 1.0), (1.0, 0.0, 0.5)),
    )
    assert (f.order, f.is_recursive) == (3, True)


def test_zeros_and_poles_in_powers_of_z_become_delays_in_powers_of_z_inverse():
    f = Filter.from_zeros_poles([0.5], [0, 0.25 + 0.5j, 0.25 - 0.5j], 2, rate=48000)
    assert f.factors == (ZerosPoles((0.5 + 0j,), (0.25 + 0.5j, 0.25 - 0.5j), 2.0, delay=2),)
    b, a = f.whole()
    assert b == (0.0, 0.0, 2.0, -1.0)
    assert a == (1.0, -0.5, 0.3125)
    assert f.order == 3


def test_as_many_zeros_at_the_origin_as_poles_are_no_delay():
    f = Filter.from_zeros_poles([0, 0], [0.5, 0.25], 1, rate=48000)
    assert f.factors == (ZerosPoles((), (0.5 + 0j, 0.25 + 0j), 1.0, delay=0),)


def test_roots_are_kept_with_pairs_first_and_upper_before_lower():
    f = Filter.from_zeros_poles([1], [0.5, -0.5j, 0.5j], 1, rate=48000)
    assert f.factors[0].poles == (0.5j, -0.5j, 0.5 + 0j)


def test_coefficients_give_zeros_poles_gain_and_delay():
    f = Filter.from_coefficients([0, 3, -1.5, 0], [1, 0, 0.25], rate=48000)
    assert f.zeros_poles() == ZerosPoles((0.5 + 0j,), (0.5j, -0.5j), 3.0, delay=1)


def test_zeros_and_poles_of_a_cascade_are_those_of_its_factors_with_nothing_cancelled():
    first = Filter.from_coefficients([2, -1], [1, 0, 0.25], rate=48000)
    second = Filter.from_zeros_poles([0.5j, -0.5j], [0.5, 0.25], 3, rate=48000)
    assert Filter.cascade([first, second]).zeros_poles() == ZerosPoles(
        (0.5j, -0.5j, 0.5 + 0j), (0.5j, -0.5j, 0.5 + 0j, 0.25 + 0j), 6.0
    )


def test_the_whole_is_multiplied_exactly_and_rounded_once():
    factors = [[1.0, 0.1], [1.0, 0.3], [1.0, -0.7]]
    f = Filter.cascade([Filter.from_coefficients(b, rate=48000) for b in factors])
    x, y, z = Fraction(0.1), Fraction(0.3), Fraction(-0.7)
    assert f.whole()[0] == (1.0, float(x + y + z), float(x * y + x * z + y * z), float(x * y * z))


def test_a_designed_filter_keeps_its_poles_and_expanded_coefficients_have_those_of_the_coefficients():
    """Order 8 at 20 Hz and 48 kHz: |p| of the outer pair is 0.99949; expanded, poles leave the circle."""
    f = design("butterworth", rate=48000, response="low-pass", order=8, frequency=20)
    designed = f.zeros_poles()
    assert designed == f.factors[0]
    # The prewarped prototype pole nearest the axis is at w (-sin(pi/16) +- j cos(pi/16)), w = tan(pi 20 / 48000).
    w = np.tan(np.pi * 20 / 48000)
    s = w * complex(-np.sin(np.pi / 16), np.cos(np.pi / 16))
    outermost = max(designed.poles, key=abs)
    # scipy computes each part with a few roundings; so does this line.
    assert abs(outermost) == pytest.approx(abs((1 + s) / (1 - s)), abs=1e-15)
    expanded = Filter.from_coefficients(*f.whole(), rate=48000)
    assert (f.unstable_poles(), expanded.unstable_poles() > 0) == (0, True)
    assert max(map(abs, expanded.zeros_poles().poles)) > 1


def test_roots_of_expanded_coefficients_satisfy_those_coefficients():
    f = design("butterworth", rate=48000, response="low-pass", order=8, frequency=20)
    _, a = f.whole()
    poles = Filter.from_coefficients([1.0], a, rate=48000).zeros_poles().poles
    assert len(poles) == 8
    exact = [Fraction(x) for x in a]
    for pole in poles:
        real, imaginary = Fraction(pole.real), Fraction(pole.imag)
        value, slope = (Fraction(0), Fraction(0)), (Fraction(0), Fraction(0))
        for coefficient in exact:
            slope = _plus(_times(slope, (real, imaginary)), value)
            value = _plus(_times(value, (real, imaginary)), (coefficient, Fraction(0)))
        # Newton's step from a rounded simple root is its rounding, at most sqrt(1/2) unit of each part.
        step = abs(complex(*map(float, value))) / abs(complex(*map(float, slope)))
        assert step < 2.0**-53


def _times(x, y):
    return x[0] * y[0] - x[1] * y[1], x[0] * y[1] + x[1] * y[0]


def _plus(x, y):
    return x[0] + y[0], x[1] + y[1]


def test_a_cascade_is_given_as_sections_if_all_its_filters_are():
    section = Filter.from_coefficients([1, 2], rate=48000)
    assert Filter.cascade([section, section]).sections_given
    pole = Filter.from_zeros_poles([], [0.5], 1, rate=48000)
    assert not Filter.cascade([section, pole]).sections_given


def test_order_counts_the_longer_of_numerator_and_denominator():
    delays = Filter.from_coefficients([0, 0, 0, 1], rate=48000)
    assert (delays.order, delays.is_recursive) == (3, False)
    pole = Filter.from_coefficients([1], [1, -0.5], rate=48000)
    assert (Filter.cascade([delays, pole]).order, pole.is_recursive) == (3, True)


NAN, INF = float("nan"), float("inf")


@pytest.mark.parametrize(
    ("b", "a", "message"),
    [
        ([], [1], "b is empty; at least one number is needed"),
        ([1], [], "a is empty"),
        ([1], [0, 1], r"a\[0\] is 0; the first of the 2 numbers in a must not be 0"),
        ([1, NAN], [1], r"b\[1\] is nan, which is not finite"),
        ([1], [1, -INF], r"a\[1\] is -inf, which is not finite"),
        (["1"], [1], r"b\[0\] is '1', which is not a real number"),
        ([1j], [1], r"b\[0\] is 1j, which is not a real number"),
        ([True], [1], r"b\[0\] is True, which is not a real number"),
        ([[1, 2]], [1], r"b\[0\] is \[1, 2\], which is not a real number"),
        ([10**400], [1], r"b\[0\] is larger than float64 holds"),
        ("12", [1], "b is '12', which is not a list"),
        (1.0, [1], "b is 1.0, which is not a list"),
        (np.array(1.0), [1], r"b is array\(1\.\), which is not a list"),
        ([1e300], [1e-300], "larger than float64 holds"),
    ],
)
def test_what_is_no_list_of_coefficients_is_refused(b, a, message):
    with pytest.raises(FilterError, match=message):
        Filter.from_coefficients(b, a, rate=48000)


@pytest.mark.parametrize("rate", [0, -48000, NAN, INF, "48000", None, True])
def test_what_is_no_rate_is_refused(rate):
    with pytest.raises(FilterError, match=f"rate is {rate!r}"):
        Filter.from_coefficients([1], rate=rate)


@pytest.mark.parametrize(
    ("sos", "message"),
    [
        ([], "sections is empty"),
        ([[1, 0, 0, 1, 0]], r"sections\[0\] has 5 numbers; a section is six: b0 b1 b2 a0 a1 a2"),
        ([[1, 0, 0, 1, 0, 0], [1, 0, 0, 0, 1, 0]], r"a0 of sections\[1\] is 0"),
        ([[1, 0, 0, 1, NAN, 0]], r"sections\[0\]\[4\] is nan"),
        ([1, 0, 0, 1, 0, 0], r"sections\[0\] is 1, which is not a list"),
    ],
)
def test_what_is_no_table_of_sections_is_refused(sos, message):
    with pytest.raises(FilterError, match=message):
        Filter.from_sections(sos, rate=48000)


@pytest.mark.parametrize(
    ("z", "p", "k", "message"),
    [
        ([0.5, 1], [0.5], 1, "2 zeros and 1 poles; as many poles as zeros are needed"),
        ([0.5j], [0.5], 1, r"zeros\[0\] is 0\.5j and its conjugate"),
        ([], [0.5, 0.5 - 0.1j], 1, r"poles\[1\] is \(0\.5-0\.1j\) and its conjugate"),
        ([], [0.5j, 0.5j, -0.5j], 1, r"poles\[1\] is 0\.5j and its conjugate"),
        ([], [0.5 + 0.1j, 0.5 - 0.10000000001j], 1, r"poles\[0\] is .* exactly conjugate pairs"),
        ([], [complex(NAN, 0)], 1, r"poles\[0\] is \(nan\+0j\), which is not finite"),
        ([], ["0.5"], 1, r"poles\[0\] is '0\.5', which is not a number"),
        ([], [0.5], 1j, "factor is 1j, which is not a real number"),
        ([], [0.5], INF, "factor is inf, which is not finite"),
    ],
)
def test_what_are_no_zeros_and_poles_is_refused(z, p, k, message):
    with pytest.raises(FilterError, match=message):
        Filter.from_zeros_poles(z, p, k, rate=48000)


def test_a_cascade_of_nothing_or_of_two_rates_is_refused():
    with pytest.raises(FilterError, match="at least one is needed"):
        Filter.cascade([])
    both = [Filter.from_coefficients([1], rate=rate) for rate in (48000, 44100)]
    with pytest.raises(FilterError, match="have the rates 44100, 48000 Hz; all must have one"):
        Filter.cascade(both)
