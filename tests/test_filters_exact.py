"""Exact polynomials: products, rounding, roots to coefficients, repeated factors."""

from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from streamhost.errors import FilterError
from streamhost.filters.exact import (
    conjugate_section,
    exactly,
    from_roots,
    product,
    rounded,
    square_root,
    stripped,
    value,
)
from streamhost.filters.square_free import square_free_factors

fractions = st.fractions(min_value=-4, max_value=4, max_denominator=64)
polynomials = st.lists(fractions, min_size=1, max_size=5).map(tuple)


@given(polynomials, polynomials, fractions)
def test_the_value_of_a_product_is_the_product_of_the_values(p, q, x):
    assert value(product(p, q), x) == value(p, x) * value(q, x)


def test_coefficients_are_rounded_once_to_the_nearest():
    assert rounded([Fraction(1, 3), Fraction(1, 10)]) == (1 / 3, 0.1)


def test_a_coefficient_beyond_float64_is_refused():
    with pytest.raises(FilterError, match="larger than float64 holds"):
        rounded([Fraction(10) ** 400])


def test_stripping_keeps_inner_zeros_and_one_coefficient():
    assert stripped(exactly([1, 0, 2, 0, 0])) == (1, 0, 2)
    assert stripped(exactly([0, 0])) == (0,)


def test_a_conjugate_pair_gives_its_real_part_and_radius_exactly():
    pair = [complex(0.1, 0.2), complex(0.1, -0.2)]
    assert from_roots(pair) == (1, -2 * Fraction(0.1), Fraction(0.1) ** 2 + Fraction(0.2) ** 2)


def test_a_section_of_a_pair_and_two_real_roots():
    section = conjugate_section([0.5 + 0.25j, 0.5 - 0.25j], [0.75 + 0j, -0.5 + 0j], 2.0)
    assert section.b == (2.0, -2.0, 0.625)
    assert section.a == (1.0, -0.25, -0.375)


def test_a_section_rounds_its_gain_into_the_coefficients_once():
    section = conjugate_section([0.1 + 0j], [], 0.1)
    assert section.b == (0.1, float(-(Fraction(0.1) ** 2)))
    assert section.a == (1.0,)


def test_half_a_pair_is_a_bug_of_the_caller():
    with pytest.raises(AssertionError, match="conjugate"):
        conjugate_section([0.5 + 0.25j], [], 1.0)


@given(st.fractions(min_value=Fraction(1, 10**12), max_value=10**12))
def test_the_square_root_is_low_by_less_than_two_to_the_minus_256(x):
    root = square_root(x)
    assert root**2 <= x < (root * (1 + Fraction(1, 1 << 256))) ** 2


@given(st.dictionaries(fractions, st.integers(1, 4), min_size=1, max_size=4))
def test_repeated_factors_are_split_off_with_their_multiplicity(multiplicities):
    whole = (Fraction(1),)
    for root, count in multiplicities.items():
        for _ in range(count):
            whole = product(whole, (Fraction(1), -root))
    wanted = {}
    for root, count in multiplicities.items():
        wanted[count] = product(wanted.get(count, (Fraction(1),)), (Fraction(1), -root))
    assert {count: factor for factor, count in square_free_factors(whole)} == wanted
