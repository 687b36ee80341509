"""The five direct forms: what they draw, node by node, and what that computes."""

import inspect
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import signal
from structure_evaluator import response, run, series, written

from streamhost.diagram import Counts
from streamhost.errors import StructureError
from streamhost.filters import Filter
from streamhost.structures import Built, build, form, forms

ALL = ("direct-1", "direct-1-swapped", "direct-2", "transposed-1", "transposed-2")
RECURSION_FIRST = ("direct-1-swapped", "direct-2", "transposed-1")

# Dyadic coefficients: their products and quotients by a0 = 1 are exact, so that no test here needs a tolerance.
COEFFICIENT = st.integers(-127, 127).map(lambda code: code / 64)


def polynomials(longest: int) -> st.SearchStrategy[tuple[list[float], list[float]]]:
    b = st.lists(COEFFICIENT, min_size=1, max_size=longest)
    a = st.lists(COEFFICIENT, max_size=longest - 1).map(lambda rest: [1.0, *rest])
    return st.tuples(b, a)


def whole(name: str, b: list[float], a: list[float], **choices: str) -> Built:
    return build(Filter.from_coefficients(b, a, rate=48000), form=name, decomposition="whole", **choices)


def stripped(values: list[float]) -> list[float]:
    last = max((i for i, value in enumerate(values) if value != 0), default=0)
    return values[: last + 1]


BIQUAD = ([0.5, 0.25, 0.125], [1.0, -0.75, 0.375])

# Written down by hand from the table of the order in which sums are added: delays, then node by node.
DRAWN = {
    "direct-1": """
        input x; x1 = z(x); x2 = z(x1); y1 = z(y); y2 = z(y1);
        b2 = b2 * x2; a2 = a2 * y2; b1 = b1 * x1; a1 = a1 * y1; b0 = b0 * x;
        y = b2 - a2 + b1 - a1 + b0; output y = y""",
    "direct-1-swapped": """
        input x; w1 = z(w); w2 = z(w1); v1 = z(w); v2 = z(v1);
        a2 = a2 * w2; a1 = a1 * w1; w = - a2 - a1 + x;
        b2 = b2 * v2; b1 = b1 * v1; b0 = b0 * w; y = b2 + b1 + b0; output y = y""",
    "direct-2": """
        input x; w1 = z(w); w2 = z(w1);
        a2 = a2 * w2; a1 = a1 * w1; w = - a2 - a1 + x;
        b2 = b2 * w2; b1 = b1 * w1; b0 = b0 * w; y = b2 + b1 + b0; output y = y""",
    "transposed-1": """
        input x; ds1 = z(s1); ds2 = z(s2); dt1 = z(t1); dt2 = z(b2);
        v = x + ds1; a1 = a1 * v; s1 = - a1 + ds2; a2 = a2 * v; s2 = - a2;
        b0 = b0 * v; y = b0 + dt1; b1 = b1 * v; t1 = b1 + dt2; b2 = b2 * v; output y = y""",
    "transposed-2": """
        input x; d1 = z(s1); d2 = z(s2);
        b0 = b0 * x; y = b0 + d1; b1 = b1 * x; a1 = a1 * y; s1 = b1 - a1 + d2;
        b2 = b2 * x; a2 = a2 * y; s2 = b2 - a2; output y = y""",
}

# Multiplications, additions, delays of a second-order section; of direct-1, direct-2 and transposed-2 as counted in
# Oppenheim & Schafer, ch. 6, and Mitra (from memory). The others have the delays of both halves.
BIQUAD_COUNTS = {
    "direct-1": Counts(5, 4, 4), "direct-1-swapped": Counts(5, 4, 4), "direct-2": Counts(5, 4, 2),
    "transposed-1": Counts(5, 4, 4), "transposed-2": Counts(5, 4, 2),
}


def test_the_direct_forms_come_first() -> None:
    assert forms()[:5] == ALL


@pytest.mark.parametrize("name", ALL)
def test_a_biquad_is_drawn_in_the_tables_order(name: str) -> None:
    lines = [line.strip() for line in DRAWN[name].split(";")]
    assert written(whole(name, *BIQUAD).diagram) == lines


@pytest.mark.parametrize("name", ALL)
def test_a_biquad_has_the_textbooks_counts(name: str) -> None:
    assert whole(name, *BIQUAD).diagram.counts() == BIQUAD_COUNTS[name]


@pytest.mark.parametrize("order", [1, 2, 3, 8])
def test_direct_2_of_order_n_has_the_textbooks_counts(order: int) -> None:
    """2N+1 multiplications, 2N additions, N delays: Oppenheim & Schafer, ch. 6 (from memory)."""
    values = [0.5] * (order + 1)
    assert whole("direct-2", values, [1.0, *values[1:]]).diagram.counts() == Counts(2 * order + 1, 2 * order, order)


@pytest.mark.parametrize("name", ALL)
@given(polynomials(13))
def test_counts_of_any_numerator_and_denominator(name: str, both: tuple[list[float], list[float]]) -> None:
    """M + N + 1 gains, one addition less, and M + N delays or, where the halves share them, max(M, N)."""
    b, a = map(stripped, both)
    m, n = len(b) - 1, len(a) - 1
    shared = name in ("direct-2", "transposed-2")
    assert whole(name, *both).diagram.counts() == Counts(m + n + 1, m + n, max(m, n) if shared else m + n)


@pytest.mark.parametrize("name", ALL)
@given(polynomials(13))
def test_the_impulse_response_is_that_of_the_polynomials_exactly(
    name: str, both: tuple[list[float], list[float]]
) -> None:
    """Stable or not, in exact arithmetic: 30 frames are more than the 2 x 12 that an order of 12 is known by."""
    assert response(whole(name, *both).diagram, 30, Fraction) == series(*both, 30)


@pytest.mark.parametrize("name", ALL)
@given(st.lists(polynomials(3), min_size=1, max_size=6))
def test_a_cascade_of_given_sections_is_their_product_exactly(
    name: str, rows: list[tuple[list[float], list[float]]]
) -> None:
    sos = [[*(b + [0.0, 0.0])[:3], *(a + [0.0, 0.0])[:3]] for b, a in rows]
    built = build(Filter.from_sections(sos, rate=48000), form=name)
    b, a = [Fraction(1)], [Fraction(1)]
    for row in sos:
        b, a = convolved(b, row[:3]), convolved(a, row[3:])
    assert response(built.diagram, 30, Fraction) == series(b, a, 30)


def convolved(left: list[Fraction], right: list[float]) -> list[Fraction]:
    result = [Fraction(0)] * (len(left) + len(right) - 1)
    for i, x in enumerate(left):
        for j, y in enumerate(right):
            result[i + j] += x * Fraction(y)
    return result


@pytest.mark.parametrize("name", ALL)
@given(polynomials(7), st.integers(1, 3))
def test_nodes_are_evaluated_in_the_order_of_their_creation(
    name: str, both: tuple[list[float], list[float]], sections: int
) -> None:
    b, a = both
    whole_order = whole(name, b, a).diagram
    row = [*(b + [0.0, 0.0])[:3], *(a + [0.0, 0.0])[:3]]
    in_series = build(Filter.from_sections([row] * sections, rate=48000), form=name).diagram
    for diagram in (whole_order, in_series):
        assert diagram.order == tuple(range(len(diagram.nodes)))


# --- float64 against filters of others


def test_transposed_2_in_float64_is_sosfilt_bit_for_bit() -> None:
    """scipy's sosfilt adds in the same order, section after section."""
    rng = np.random.default_rng(3)
    x = rng.standard_normal(300)
    for order in range(2, 13, 2):
        sos = signal.ellip(order, 1.0, 60.0, 0.2, output="sos")
        built = build(Filter.from_sections(sos, rate=48000), form="transposed-2")
        found = [frame["output"] for frame in run(built.diagram, x.tolist(), float)]
        assert np.array_equal(found, signal.sosfilt(sos, x))


@pytest.mark.parametrize("name", ALL)
@pytest.mark.parametrize("decomposition", ["whole", "cascade"])
@given(st.integers(1, 12), st.integers(0, 2**32 - 1))
def test_stable_filters_in_float64_agree_with_scipy(name: str, decomposition: str, order: int, seed: int) -> None:
    zeros, poles = random_roots(order, seed, 1.0), random_roots(order, seed + 1, 0.8)
    built = build(
        Filter.from_zeros_poles(zeros, poles, 0.7, rate=48000), form=name, decomposition=decomposition
    )
    x = np.random.default_rng(seed).uniform(-1, 1, 60)
    frames = run(built.diagram, x.tolist(), float)
    found = np.array([frame["output"] for frame in frames])
    if decomposition == "whole":
        (section,) = built.sections
        wanted = signal.lfilter(section.b, section.a, x)
    else:
        wanted = signal.sosfilt([[*padded(s.b), *padded(s.a)] for s in built.sections], x)
    assert np.max(np.abs(found - wanted)) <= rounding_bound(built, frames)


def padded(values: tuple[float, ...]) -> list[float]:
    return [*values, *[0.0] * (3 - len(values))]


def random_roots(count: int, seed: int, radius: float) -> list[complex]:
    rng = np.random.default_rng(seed)
    pairs = rng.integers(0, count // 2 + 1)
    upper = radius * rng.uniform(0.1, 1, pairs) * np.exp(1j * rng.uniform(0.1, 3, pairs))
    return [*upper, *upper.conj(), *rng.uniform(-radius, radius, count - 2 * pairs)]


def rounding_bound(built: Built, frames: list[dict[str, float]]) -> float:
    """What both sides' roundings can add up to at the output.

    Each operation rounds its result, at most the largest value of a node (twice it for a partial sum's neighbour),
    by 2^-53; there are two operations a node and two sides, and what was rounded in one section passes at most through
    (1 + |b|)(1 + |a|) / A of that section and of all later ones.
    """
    gain = 1.0
    for section in built.sections:
        tail = float(np.sum(np.abs(signal.lfilter([1.0], section.a, np.eye(1, 400)[0]))))
        gain *= (1 + sum(map(abs, section.b))) * (1 + sum(map(abs, section.a))) * tail
    largest = max(abs(value) for frame in frames for value in frame.values())
    return len(built.diagram.nodes) * 4 * 2.0**-52 * largest * gain


# --- special shapes


@pytest.mark.parametrize("name", ALL)
def test_a_constant_is_one_gain(name: str) -> None:
    assert written(whole(name, [0.5], [1.0]).diagram) == ["input x", "b0 = b0 * x", "output y = b0"]


@pytest.mark.parametrize("name", ALL)
def test_a_zero_numerator_keeps_b0(name: str) -> None:
    built = whole(name, [0.0, 0.0], [1.0, 0.5])
    assert [slot.label for slot in built.diagram.slots if slot.part == "b"] == ["b0"]
    assert response(built.diagram, 8, Fraction) == [0] * 8


@pytest.mark.parametrize("name", ALL)
def test_inner_zeros_and_ones_stay_and_trailing_zeros_go(name: str) -> None:
    built = whole(name, [0.0, 1.0, 0.0, 0.0], [1.0, 0.0, 0.5, 0.0])
    labels = {slot.label for slot in built.diagram.slots}
    assert labels == {"b0", "b1", "a1", "a2"}
    assert built.sections[0].b == (0.0, 1.0) and built.sections[0].a == (1.0, 0.0, 0.5)


@pytest.mark.parametrize("name", RECURSION_FIRST)
def test_without_recursion_the_recursive_node_is_the_input(name: str) -> None:
    diagram = whole(name, [0.5, 0.25, 0.125], [1.0]).diagram
    assert not {"w", "v"} & {node.label for node in diagram.nodes}
    b0 = next(node for node in diagram.nodes if node.label == "b0")
    assert b0.reads == diagram.inputs


@pytest.mark.parametrize("name", ["direct-1", "direct-1-swapped", "direct-2"])
def test_a_finite_response_is_a_tapped_line_added_from_its_end(name: str) -> None:
    diagram = whole(name, [0.5, 0.25, 0.125], [1.0]).diagram
    assert written(diagram)[-2:] == ["y = b2 + b1 + b0", "output y = y"]
    assert not diagram.has_loop()


@pytest.mark.parametrize("name", ["direct-2", "direct-1-swapped"])
def test_purely_recursive_ends_in_a_gain(name: str) -> None:
    lines = written(whole(name, [0.5], [1.0, -0.75, 0.375]).diagram)
    assert lines == [
        "input x", "w1 = z(w)", "w2 = z(w1)", "a2 = a2 * w2", "a1 = a1 * w1", "w = - a2 - a1 + x",
        "b0 = b0 * w", "output y = b0",
    ]


def test_longer_halves_go_on_alone() -> None:
    """transposed-2 with M > N ends in lone products, with N > M in lone subtracted ones."""
    longer_b = written(whole("transposed-2", [0.5, 0.25, 0.125], [1.0, -0.5]).diagram)
    assert "d2 = z(b2)" in longer_b and "s1 = b1 - a1 + d2" in longer_b
    longer_a = written(whole("transposed-2", [0.5, 0.25], [1.0, -0.5, 0.25]).diagram)
    assert "s2 = - a2" in longer_a and "s1 = b1 - a1 + d2" in longer_a


@pytest.mark.parametrize("name", ALL)
def test_a_long_finite_response_can_be_drawn(name: str) -> None:
    b = [k / 1024 for k in range(1, 1001)]
    counts = whole(name, b, [1.0]).diagram.counts()
    assert counts == Counts(1000, 999, 999)


# --- slots and sections


@pytest.mark.parametrize("name", ALL)
def test_slots_say_part_section_and_feedback(name: str) -> None:
    rows = [[0.5, 0.25, 0.125, 1.0, -0.75, 0.375], [1.0, 0.5, 0.25, 1.0, 0.25, 0.125]]
    slots = build(Filter.from_sections(rows, rate=48000), form=name).diagram.slots
    found = {slot.label: (slot.section, slot.part, slot.feedback) for slot in slots}
    wanted = {}
    for section in (0, 1):
        wanted |= {f"b{k}_{section + 1}": (section, "b", False) for k in range(3)}
        wanted |= {f"a{k}_{section + 1}": (section, "a", True) for k in (1, 2)}
    assert found == wanted


def test_a_register_stands_between_sections_and_delays_are_not_shared() -> None:
    rows = [[0.5, 0.25, 0.0, 1.0, -0.75, 0.0], [1.0, 0.5, 0.0, 1.0, 0.25, 0.0]]
    assert written(build(Filter.from_sections(rows, rate=48000), form="direct-1").diagram) == [
        "input x", "x1_1 = z(x)", "y1_1 = z(y_1)",
        "b1_1 = b1_1 * x1_1", "a1_1 = a1_1 * y1_1", "b0_1 = b0_1 * x", "y_1 = b1_1 - a1_1 + b0_1",
        "between_1 = [y_1]", "x1_2 = z(between_1)", "y1_2 = z(y_2)",
        "b1_2 = b1_2 * x1_2", "a1_2 = a1_2 * y1_2", "b0_2 = b0_2 * between_1", "y_2 = b1_2 - a1_2 + b0_2",
        "output y = y_2",
    ]


# --- explanations


@pytest.mark.parametrize("name", ALL)
def test_a_form_explains_itself(name: str) -> None:
    found = form(name)
    assert found.docs.startswith(f"{name}: ") and found.summary
    for part in ("Source:", "Counts:", "Good at:", "Fails:", "Carries:", "z^-1"):
        assert part in found.docs


@pytest.mark.parametrize("name", ALL)
def test_the_explanations_counts_are_the_drawn_ones(name: str) -> None:
    counts = whole(name, *BIQUAD).diagram.counts()
    stated = f"a second-order section {counts.multiplications}, {counts.additions}, {counts.delays}"
    assert stated in form(name).docs.replace("\n", " ")


@pytest.mark.parametrize("name", ALL)
def test_the_half_that_comes_first_is_the_stated_one(name: str) -> None:
    """Where the input reaches a multiplication by b without passing one by a's sum, the numerator is first."""
    wanted = "recursion" if name in RECURSION_FIRST else "numerator"
    diagram = whole(name, *BIQUAD).diagram
    b0 = next(node for node in diagram.nodes if node.label == "b0")
    assert form(name).begins_with == wanted
    assert (b0.reads == diagram.inputs) == (wanted == "numerator")


def test_an_unknown_form_is_refused_with_the_nearest() -> None:
    with pytest.raises(StructureError, match=r'''no form 'transposed-3'\. Did you mean "transposed-2"'''):
        form("transposed-3")
    with pytest.raises(StructureError, match="Allowed are direct-1, direct-1-swapped"):
        build(Filter.from_coefficients([1.0], rate=48000), form="")


def test_each_form_is_a_file_whose_docstring_it_shows() -> None:
    for name in ALL:
        module = inspect.getmodule(form(name).build_section)
        assert module is not None and module.__doc__ == form(name).docs
        assert module.__name__.endswith(name.replace("-", "_"))
