"""A preset's text from a filter: what is read back is the filter, bit for bit."""

from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from streamhost.filters import Filter
from streamhost.presets import parse_preset
from streamhost.presets.importing.stated import MOST_NUMBERS
from streamhost.presets.reading import LARGEST_BYTES
from streamhost.presets.writing import preset_text

rates = st.one_of(st.sampled_from([48000.0, 44100.0, 8000]), st.floats(min_value=1e-300, max_value=1e300))
# No quotient of two of them vanishes in float64.
numbers = st.one_of(st.sampled_from([0.0, 1.0, -2.0, 0.1]), st.floats(-1e100, 1e100).filter(lambda value: abs(value) > 1e-100))
leading = numbers.filter(bool)
lists = st.builds(lambda first, rest: [first, *rest], leading, st.lists(numbers, max_size=9))
rows = st.tuples(numbers, numbers, numbers, leading, numbers, numbers)
codes = st.lists(st.integers(-(2**15), 2**15 - 1), min_size=5, max_size=5)
halves = st.complex_numbers(max_magnitude=1e100).filter(lambda root: root.imag != 0)
roots = st.builds(
    lambda pairs, reals: [part for root in pairs for part in (root, root.conjugate())] + reals,
    st.lists(halves, max_size=2), st.lists(numbers, max_size=3),
)
words = st.sampled_from(["Q1.15", "Q2.14", "Q-3.19"])
filters = st.one_of(
    st.builds(lambda b, a, rate: Filter.from_coefficients(b, a, rate=rate), lists, lists, rates),
    st.builds(lambda sos, rate: Filter.from_sections(sos, rate=rate), st.lists(rows, min_size=1, max_size=3), rates),
    st.builds(lambda table, word, rate: Filter.from_codes(table, word, rate=rate), st.lists(codes, min_size=1, max_size=3),
              words, rates),
    st.builds(lambda z, p, k, rate: Filter.from_zeros_poles(z, [*p, *([0.0] * len(z))], k, rate=rate), roots, roots, numbers,
              rates),
)
kinds = st.one_of(
    st.builds(lambda b, a: Filter.from_coefficients(b, a, rate=48000), lists, lists),
    st.builds(lambda sos: Filter.from_sections(sos, rate=48000), st.lists(rows, min_size=1, max_size=2)),
    st.builds(lambda p: Filter.from_zeros_poles([], p, 0.5, rate=48000), roots),
)


@given(filters)
def test_every_filter_is_read_back(wanted):
    assert parse_preset(preset_text(wanted)).filter == wanted


@given(st.lists(kinds, min_size=2, max_size=5).map(Filter.cascade))
def test_every_cascade_is_read_back(wanted):
    assert parse_preset(preset_text(wanted)).filter == wanted


def test_a_cascade_of_codes_is_read_back():
    part = Filter.from_codes([[1899, -3798, 1899, 4096, -7807, 3733]], "Q4.12", rate=48000)
    wanted = Filter.cascade([part, part])
    assert parse_preset(preset_text(wanted)).filter == wanted


def test_the_longest_import_is_no_longer_than_a_preset_may_be():
    longest = [-1.2345678901234567e-100] * MOST_NUMBERS
    text = preset_text(Filter.from_coefficients(longest, rate=48000))
    assert len(repr(longest[0])) == 24  # as long as a float64 gets
    assert len(text) < LARGEST_BYTES


def test_how_it_looks():
    parts = [
        Filter.from_sections([[0.1, 0.2, 0.3, 1, -0.4, 0.5], [1, 0, 0, 1, 0, 0]], rate=44100),
        Filter.from_coefficients([0.25, 0.5], rate=44100),
        Filter.from_coefficients([Fraction(1, 3)] * 5, [1, -0.5], rate=44100),
        Filter.from_zeros_poles([1.0], [0.5 + 0.25j, 0.5 - 0.25j, 0.0], 2.0, rate=44100),
    ]
    assert preset_text(Filter.cascade(parts), comments=("Made by hand.",)) == """# Made by hand.
rate = 44100.0

[[filter]]
sections = [
    [0.1, 0.2, 0.3, 1.0, -0.4, 0.5],
    [1.0, 0.0, 0.0, 1.0, 0.0, 0.0],
]

[[filter]]
b = [0.25, 0.5]

[[filter]]
b = [
    0.3333333333333333, 0.3333333333333333, 0.3333333333333333, 0.3333333333333333,
    0.3333333333333333,
]
a = [1.0, -0.5]

[[filter]]
zeros = [1.0]
poles = [[0.5, 0.25], [0.5, -0.25], 0.0]
factor = 2.0
"""


@pytest.mark.parametrize("mark", ["\n", "\r", "\x1b", "\x85", "\u2028", "\0"])
def test_a_comment_stays_a_comment(mark):
    wanted = Filter.from_coefficients([1.0], rate=48000)
    text = preset_text(wanted, comments=(f"from{mark}rate = 1",))
    assert mark not in text.partition("rate = 48000")[0].removesuffix("\n")
    assert parse_preset(text).filter == wanted
