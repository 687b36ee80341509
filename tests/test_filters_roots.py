"""Roots of float64 polynomials: known roots come back, repeated ones too, and crowded ones are accurate."""

from collections import Counter
from fractions import Fraction

import mpmath
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from streamhost.filters.exact import from_roots, rounded
from streamhost.filters.roots import roots, roots_outside

eighths = st.integers(-12, 12).map(lambda n: n / 8)
real_roots = st.lists(eighths.filter(bool), max_size=4)
upper_roots = st.lists(st.builds(complex, eighths, st.integers(1, 12).map(lambda n: n / 8)), max_size=3)


def with_conjugates(upper, real):
    return [root for top in upper for root in (top, top.conjugate())] + [complex(root) for root in real]


@settings(max_examples=60)
@given(upper_roots, real_roots)
def test_roots_in_eighths_come_back_exactly_with_their_multiplicity(upper, real):
    """Ten roots in eighths have coefficients of at most 10 * 3 fraction bits: float64 holds them without rounding."""
    given_roots = with_conjugates(upper, real)
    polynomial = from_roots(given_roots)
    coefficients = rounded(polynomial)
    assert all(Fraction(x) == y for x, y in zip(coefficients, polynomial, strict=True))
    assert Counter(roots(coefficients)) == Counter(given_roots)


@settings(max_examples=60)
@given(upper_roots, real_roots)
def test_roots_on_or_outside_the_circle_are_counted(upper, real):
    given_roots = with_conjugates(upper, real)
    outside = sum(Fraction(r.real) ** 2 + Fraction(r.imag) ** 2 >= 1 for r in given_roots)
    assert roots_outside(rounded(from_roots(given_roots))) == outside


def test_conjugates_are_exact_and_next_to_each_other_and_real_roots_come_last():
    found = roots((1.0, -1.2, 0.07, 0.3, -0.08, 0.011, -0.02))
    assert len(found) == 6
    upper, lower = found[0:-2:2], found[1:-2:2]
    assert all(a.imag > 0 and a == b.conjugate() for a, b in zip(upper, lower, strict=True))
    assert [root.imag for root in found[-2:]] == [0, 0]


@pytest.mark.parametrize(
    "coefficients",
    [
        (1.0, -1.99, 0.9901),
        (1.0, -2.0, 1.0),
        (3.0, 1.0),
        (1.0, -1e8, 1.0),
        (1.0, 0.0, -2.0),
        (1.0, -3.9999, 5.9998, -3.9999, 1.0001),
    ],
)
def test_roots_satisfy_their_polynomial_to_the_last_bit(coefficients):
    """A correctly rounded root is within half a unit of each part; a unit and a half leaves room for the radius."""
    found = roots(coefficients)
    assert len(found) == len(coefficients) - 1
    with mpmath.workprec(400):
        for root in found:
            steps = [mpmath.mpc(root)]
            for _ in range(60):
                value = mpmath.polyval(coefficients[::-1], steps[-1], asc=True)
                slope = mpmath.polyval(_slope(coefficients)[::-1], steps[-1], asc=True)
                steps.append(steps[-1] - value / slope if slope else steps[-1])
            assert abs(steps[-1] - steps[0]) <= 1.5 * 2.0**-53 * abs(root)


def _slope(descending):
    degree = len(descending) - 1
    return [(degree - i) * value for i, value in enumerate(descending[:-1])]


@pytest.mark.parametrize("sign", [1, -1])
def test_a_small_root_beside_a_huge_one_does_not_cancel(sign):
    """The roots add to -2^200 and multiply to 1: they are 2^200 and 2^-200 in magnitude, to 2^-400."""
    assert roots((1.0, sign * 2.0**200, 1.0)) == (-sign * 2.0**200, -sign * 2.0**-200)


def test_an_eightfold_root_is_found_eightfold():
    binomial = (1.0, 8.0, 28.0, 56.0, 70.0, 56.0, 28.0, 8.0, 1.0)
    assert roots(binomial) == (-1 + 0j,) * 8


def test_a_constant_has_no_roots():
    assert roots((2.0,)) == ()
