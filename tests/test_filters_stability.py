"""Stable or not, decided exactly; and how many poles are not inside the unit circle."""

from fractions import Fraction
from math import nextafter

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from streamhost.filters import Filter
from streamhost.filters.exact import from_roots, rounded


def unstable(a):
    return Filter.from_coefficients([1.0], a, rate=48000).unstable_poles()


# Jury / Schur-Cohn criterion, polynomials expanded from the roots in the last column; roots computed anew.
@pytest.mark.parametrize(
    ("a", "outside"),
    [
        ([1, -1.2, 0.07, 0.3, -0.08], 0),  # |roots| 0.8 0.5 0.5 0.4
        ([1, -1.3, -0.08, 0.24], 1),  # |roots| 1.2 0.5 0.4
    ],
)
def test_stability_of_the_textbook_examples(a, outside):
    assert unstable(a) == outside


@pytest.mark.parametrize(
    ("a", "outside"),
    [
        ([1, -1], 1),  # an integrator
        ([1, nextafter(-1, 0)], 0),  # one unit inside
        ([1, nextafter(-1, -2)], 1),
        ([1, -1.5, 1], 2),  # a pair on the circle
        ([1, -1.5, nextafter(1, 0)], 0),
        ([1, -1.5, nextafter(1, 2)], 2),
        ([1, -2, 1], 2),  # a double pole at z = 1
        ([1, 0, 0, 0, -1], 4),  # the fourth roots of 1
        ([1, 0, 0, 0, nextafter(-1, 0)], 0),
        ([1, -2.5, 1], 1),  # 2 and 1/2, a reciprocal pair
        ([1, -2.5, 2, -2.5, 1], 3),  # 2, 1/2, j, -j
        ([1], 0),
        ([1, 0, 0], 0),
    ],
)
def test_poles_on_the_circle_and_one_unit_beside_it(a, outside):
    assert unstable(a) == outside


eighths = st.integers(-12, 12).map(lambda n: n / 8)
roots = st.tuples(
    st.lists(st.builds(complex, eighths, st.integers(1, 12).map(lambda n: n / 8)), max_size=2),
    st.lists(eighths.filter(bool), max_size=3),
)


@settings(max_examples=60)
@given(roots)
def test_polynomials_and_poles_agree_with_the_radii(given_roots):
    """Roots in eighths: the coefficients are exact in float64, so both descriptions have the same poles."""
    upper, real = given_roots
    poles = [r for top in upper for r in (top, top.conjugate())] + [complex(r) for r in real]
    outside = sum(Fraction(p.real) ** 2 + Fraction(p.imag) ** 2 >= 1 for p in poles)
    assert unstable(rounded(from_roots(poles))) == outside
    assert Filter.from_zeros_poles([], poles, 1.0, rate=48000).unstable_poles() == outside


def test_a_cascade_adds_the_unstable_poles_of_its_factors():
    unsteady = Filter.from_coefficients([1], [1, -1], rate=48000)
    steady = Filter.from_coefficients([1, -1], [1, -0.5], rate=48000)
    assert Filter.cascade([unsteady, steady, unsteady]).unstable_poles() == 2


def test_low_frequency_poles_rounded_to_q14_land_on_the_circle():
    """Own computation: a cookbook low-pass at 20 Hz and 48 kHz, q 1/sqrt(2), has a = 1, -32707, 16323 in Q2.14.

    1 + a1 + a2 is exactly 0: a pole on z = 1.
    """
    rounded_filter = Filter.from_codes([[0, 0, 0, 16384, -32707, 16323]], "Q2.14", rate=48000)
    assert rounded_filter.unstable_poles() == 1
