"""Sections in parallel: partial fractions, exact and as drawn."""

from fractions import Fraction

import numpy as np
import pytest
from drawing_reader import faults_of, page_of
from form_filters import DIRECT
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import signal

from streamhost import Filter, design, realize
from streamhost.drawing import svg
from streamhost.errors import StructureError
from streamhost.filters.exact import product
from streamhost.formats import named_format
from streamhost.program.run import lower, run_definition
from streamhost.structures import build
from streamhost.structures.parallel import divide

RATE = 48000


def parallel(filter: Filter, form: str = "direct-2"):
    return build(filter, form=form, decomposition="parallel")


def test_a_textbook_expansion() -> None:
    """(1 + 2 z^-1 + z^-2) / (1 - 0.75 z^-1 + 0.125 z^-2) = 8 + (-7 + 8 z^-1) / (the same), as one section; with real poles
    1/2 and 1/4 it is 8 + 18 / (1 - 0.5 z^-1) - 25 / (1 - 0.25 z^-1): Oppenheim & Schafer, ch. 6, parallel form."""
    built = parallel(Filter.from_coefficients([1, 2, 1], [1, -0.75, 0.125], rate=RATE))
    division = built.channels[0][0].division
    assert division.direct == (8.0,)
    assert [(section.b, section.a) for section in division.sections] == [((18.0,), (1.0, -0.5)), ((-25.0,), (1.0, -0.25))]


@given(st.integers(1, 4), st.integers(0, 3), st.integers(0, 4), st.integers(0, 2**31))
@settings(max_examples=40, deadline=None)
def test_the_sum_of_the_fractions_is_the_filter(pairs: int, reals: int, more: int, seed: int) -> None:
    """In exact numbers, from coefficients that are rounded once each: within the rounding of the largest."""
    rng = np.random.default_rng(seed)
    upper = rng.uniform(0.2, 0.95, pairs) * np.exp(1j * (np.arange(pairs) + rng.uniform(0.2, 0.8, pairs)) * np.pi / pairs)
    # Apart from each other and from 0, where more zeros than poles make what stands beside the sections large.
    poles = [*upper, *upper.conj(), *(np.array([-0.8, 0.4, 0.7])[:reals] + rng.uniform(-0.1, 0.1, reals))]
    count = len(poles)
    zeros = rng.uniform(-1.2, 1.2, count).tolist() if more == 0 else rng.uniform(-1.2, 1.2, count + more).tolist()
    filter = Filter.from_zeros_poles(zeros, [*poles, *[0.0] * max(0, len(zeros) - count)], 0.7, rate=RATE)
    division = divide(filter, None, None, None)
    b, a = filter.ratio()
    total, denominator = tuple(map(Fraction, division.direct or ())), (Fraction(1),)
    for section in division.sections:
        own = tuple(map(Fraction, section.a))
        left, right = product(total, own), product(tuple(map(Fraction, section.b)), denominator)
        length = max(len(left), len(right))
        total = tuple(sum(pair) for pair in zip(_long(left, length), _long(right, length), strict=True))
        denominator = product(denominator, own)
    largest = max([1.0, *(abs(value) for section in division.sections for value in section.b), *map(abs, division.direct)])
    # Each coefficient is off by half of 2^-52 of itself and is multiplied by at most 2^count of others.
    tolerance = largest * 2.0 ** (count - 52)
    np.testing.assert_allclose([float(v) for v in _long(total, len(b) + count)], [float(v) for v in _long(b, len(b) + count)],
                               rtol=0, atol=tolerance)
    np.testing.assert_allclose([float(v) for v in denominator], [float(v) for v in a], rtol=0, atol=2.0 ** (count - 52))
    assert len(division.direct or ()) == max(1, len(b) - len(a) + 1)


def _long(values, length):
    return [*values, *[Fraction(0)] * (length - len(values))]


@pytest.mark.parametrize("form", DIRECT)
@pytest.mark.parametrize("order", [1, 3, 6, 7])
def test_scipys_filter_in_every_form(form: str, order: int) -> None:
    filter = design("elliptic", rate=RATE, response="low-pass", order=order, frequency=6000, ripple_db=0.5, stopband_db=50)
    x = np.random.default_rng(1).uniform(-1, 1, (300, 1))
    y = run_definition(lower(parallel(filter, form).diagram, named_format("float64")), x)[:, 0, 0]
    solved = filter.zeros_poles()
    expected = signal.sosfilt(signal.zpk2sos(solved.zeros, solved.poles, solved.gain), x[:, 0])
    sections = parallel(filter, form).sections
    largest = max(abs(value) for section in sections for value in (*section.b, *section.a))
    np.testing.assert_allclose(y, expected, rtol=0, atol=2.0**-52 * 100 * largest)  # a hundred roundings of the largest


def test_sections_come_nearest_the_circle_first_and_only_the_output_is_rounded() -> None:
    filter = design("butterworth", rate=RATE, response="low-pass", order=5, frequency=6000)
    built = parallel(filter, "direct-1")
    radii = [max(abs(np.roots(section.a))) for section in built.sections]
    assert radii == sorted(radii, reverse=True)
    assert [len(section.a) - 1 for section in built.sections].count(1) == 1
    assert not any(node.kind == "round" for node in built.diagram.nodes)
    realization = realize(filter, form="direct-2", decomposition="parallel", format="16x16+40")
    labels = [realization.program.nodes[i].label for i in realization.program.roundings]
    assert sum("w_" in label for label in labels) == 3 and any(label.startswith("y") for label in labels)


def test_two_real_poles_that_coincide_are_merged() -> None:
    built = parallel(Filter.from_zeros_poles([0.1, -0.3], [0.5, 0.5], 1.0, rate=RATE))
    assert [section.a for section in built.sections] == [(1.0, -1.0, 0.25)]
    nearly = parallel(Filter.from_zeros_poles([0.1, -0.3], [0.5, 0.500001], 1.0, rate=RATE))
    assert [len(section.a) for section in nearly.sections] == [3]


@pytest.mark.parametrize(("poles", "said"), [
    ([0.5, 0.5, 0.5], 'the same pole in more than one section. Allowed for it are "cascade" and "whole"'),
    ([0.5 + 0.3j, 0.5 - 0.3j, 0.5 + 0.3j, 0.5 - 0.3j], "the same pole in more than one section"),
    ([0.5 + 0.3j, 0.5 - 0.3j, 0.5 + 0.3000001j, 0.5 - 0.3000001j], "since poles of it nearly coincide"),
])  # fmt: skip
def test_other_poles_that_coincide_are_refused(poles: list[complex], said: str) -> None:
    with pytest.raises(StructureError, match=said):
        parallel(Filter.from_zeros_poles([0.1] * len(poles), poles, 1.0, rate=RATE))


def test_a_pole_near_zero_under_more_zeros_is_refused() -> None:
    filter = Filter.from_zeros_poles([0.9, -0.9, 0.8, -0.8], [0.5, 1e-3, 0.0, 0.0], 1.0, rate=RATE)
    with pytest.raises(StructureError, match="since a pole is nearly 0 beside more zeros than poles"):
        parallel(filter)


@pytest.mark.parametrize(("choices", "said"), [
    ({"pairing": "nearest"}, 'pairing "nearest" arranges sections in cascade'),
    ({"ordering": "quietest"}, 'ordering "quietest" arranges'),
    ({"scaling": "l2"}, 'scaling "l2" arranges'),
])  # fmt: skip
def test_choices_of_a_cascade_are_refused(choices: dict[str, str], said: str) -> None:
    filter = design("low-pass", rate=RATE, frequency=1000, q=1)
    with pytest.raises(StructureError, match=said):
        build(filter, form="direct-1", decomposition="parallel", **choices)
    assert build(filter, form="direct-1", decomposition="parallel", scaling="none").scaling == "none"


def test_a_finite_response_and_codes_are_refused() -> None:
    with pytest.raises(StructureError, match=r'this filter has no recursion. Allowed for it are "whole" and "cascade"'):
        parallel(Filter.from_coefficients([1, 2, 3], rate=RATE))
    codes = Filter.from_codes([[4096, 0, 0, 4096, -2048, 1024]], "Q4.12", rate=RATE)
    with pytest.raises(StructureError, match=r'"parallel" changes the sections, and this filter is given as codes'):
        parallel(codes)


@pytest.mark.parametrize("form", DIRECT)
@pytest.mark.parametrize("zeros", [0, 2, 6, 9])
def test_it_is_drawn_as_it_is(form: str, zeros: int) -> None:
    poles = [0.5 + 0.3j, 0.5 - 0.3j, -0.2 + 0.6j, -0.2 - 0.6j, 0.4, -0.7]
    zeros_at = np.linspace(-0.9, 0.9, zeros).tolist()
    filter = Filter.from_zeros_poles(zeros_at, [*poles, *[0.0] * max(0, zeros - 6)], 1.0, rate=RATE)
    diagram = parallel(filter, form).diagram
    drawn = diagram.hints.general.diagram if diagram.hints.general else diagram
    text = svg(diagram)
    assert faults_of(text, drawn) == []
    assert page_of(text).scale >= 0.65  # four branches are high: text of 6 pt


def test_channels_with_fewer_sections_have_branches_of_zeros() -> None:
    left = design("butterworth", rate=RATE, response="low-pass", order=4, frequency=6000)
    right = design("low-pass", rate=RATE, frequency=2000, q=0.7)
    both = realize((left, right), form="direct-2", decomposition="parallel")
    x = np.random.default_rng(1).uniform(-1, 1, (200, 2))
    y = both.process(x)
    for channel, filter in enumerate((left, right)):
        alone = realize(filter, form="direct-2", decomposition="parallel").process(x[:, channel])
        np.testing.assert_array_equal(y[:, channel], alone)
