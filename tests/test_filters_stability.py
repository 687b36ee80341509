"""Stable or not, decided exactly; and how many poles are not inside the unit circle."""

from cmath import rect
from fractions import Fraction
from math import nextafter
from time import process_time

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from streamhost.filters import Filter
from streamhost.filters.exact import Polynomial, from_roots, product, rounded
from streamhost.filters.stability import _is_stable_exactly, _is_stable_to, is_stable, step_down


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


def spread(order: int, largest: float) -> Polynomial:
    """The exact polynomial of conjugate pairs spread over radii up to the largest and over angles."""
    pairs = [rect(largest - 0.5 * k / order, 0.1 + 2.9 * k / order) for k in range(order // 2)]
    return from_roots([pole for upper in pairs for pole in (upper, upper.conjugate())])


def test_a_high_order_is_decided_at_once_and_exactly() -> None:
    """Before, minutes at order 64. A pole on the circle itself, which no number of bits tells, at order 24."""
    began = process_time()
    stable = spread(64, 0.97)
    assert is_stable(stable)
    assert not is_stable(spread(64, 1.03))
    assert process_time() - began < 2  # measured 0.1 s
    nearest = (Fraction(1), Fraction(-1) + Fraction(1, 2**60))
    assert is_stable(product(spread(24, 0.9), nearest))
    assert not is_stable(product(spread(24, 0.9), (Fraction(1), Fraction(-1))))


@settings(max_examples=100)
@given(st.lists(st.fractions(-3, 3, max_denominator=9), min_size=3, max_size=6))
def test_bits_and_whole_numbers_tell_what_fractions_tell(values) -> None:
    """The step-down on fractions is the textbook's; with few bits there may be no answer, never a wrong one."""
    polynomial = (Fraction(1), *values)
    told = all(abs(stage[-1]) < 1 for stage in step_down(polynomial))
    assert _is_stable_exactly(polynomial) == told
    assert all(_is_stable_to(polynomial, bits) in (None, told) for bits in (6, 12, 64))
