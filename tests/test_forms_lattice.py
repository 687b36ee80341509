"""The three lattice forms: reflection coefficients, ladders, scaling, what they carry and what they cost."""

from fractions import Fraction

import numpy as np
import pytest
from drawing_reader import crossings, faults_of, page_of
from drawn_forms import cascade, sums, whole
from form_filters import RATE, coefficients, rounding_bound
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import signal
from structure_evaluator import response, run, series

from streamhost.diagram import Builder, Counts, Diagram
from streamhost.diagram.norms import norms_from_input
from streamhost.drawing import layout_of, svg
from streamhost.errors import DiagramError, StructureError
from streamhost.filters import Filter
from streamhost.filters.stability import is_stable, step_down
from streamhost.formats import Fixed, named_format
from streamhost.program.run import lower, run_definition
from streamhost.structures import Built, build

LATTICES = ("lattice-ladder", "lattice-one-multiplier", "lattice-normalized")
DYADIC = st.integers(-7, 7).map(lambda code: Fraction(code, 8))


def step_up(k: list[Fraction]) -> list[Fraction]:
    """A of reflection coefficients k1, k2, ...: A(m) = A(m-1) + km z^-m A(m-1)(1/z)."""
    a = [Fraction(1)]
    for value in k:
        a = [x + value * y for x, y in zip([*a, Fraction(0)], [Fraction(0), *reversed(a)], strict=True)]
    return a


def drawn(name: str, b: list[float], a: list[float], **choices: str) -> Built:
    return build(Filter.from_coefficients(b, a, rate=RATE), form=name, decomposition="whole", **choices)


def random_filter(order: int, seed: int) -> Filter:
    rng = np.random.default_rng(seed)
    pairs = order // 2
    poles = 0.85 * rng.uniform(0.1, 1, pairs) * np.exp(1j * rng.uniform(0.1, 3, pairs))
    zeros = rng.uniform(0.1, 1, pairs) * np.exp(1j * rng.uniform(0.1, 3, pairs))
    real = rng.uniform(-0.85, 0.85, (2, order % 2))
    return Filter.from_zeros_poles([*zeros, *zeros.conj(), *real[0]], [*poles, *poles.conj(), *real[1]], 0.7, rate=RATE)


# --- reflection coefficients


# A(z) = 1 - 0.9 z^-1 + 0.64 z^-2 - 0.576 z^-3, the lattice example of Oppenheim & Schafer (from memory), its k recomputed
# with a(m) = +k(m); the book has the other sign.
EXAMPLE = [1.0, -0.9, 0.64, -0.576]
EXAMPLE_K = (-0.672757475, 0.181974907, -0.576)


@pytest.mark.parametrize("name", LATTICES)
def test_reflection_coefficients_of_the_textbooks_example(name: str) -> None:
    found = coefficients(drawn(name, [1.0], EXAMPLE).diagram)
    assert [found[f"k{m}"] for m in (1, 2, 3)] == pytest.approx(EXAMPLE_K, abs=5e-10)


# Polynomials expanded from these radii of their roots, in z, descending; k recomputed apart (Jury / Schur-Cohn test).
STABLE = ([1, -1.2, 0.07, 0.3, -0.08], (-0.93912, 0.33313, 0.20531, -0.08))
UNSTABLE = ([1, -1.3, -0.08, 0.24], (-1.09060, 0.24618, 0.24))


@pytest.mark.parametrize("name", LATTICES)
def test_a_stable_recursion_has_all_k_below_1(name: str) -> None:
    found = coefficients(drawn(name, [1.0], STABLE[0]).diagram)
    assert [found[f"k{m}"] for m in (1, 2, 3, 4)] == pytest.approx(STABLE[1], abs=6e-6)


@pytest.mark.parametrize("name", ["lattice-ladder", "lattice-one-multiplier"])
def test_an_unstable_recursion_is_drawn_with_a_k_above_1(name: str) -> None:
    diagram = drawn(name, [1.0], UNSTABLE[0]).diagram
    found = coefficients(diagram)
    assert [found[f"k{m}"] for m in (1, 2, 3)] == pytest.approx(UNSTABLE[1], abs=6e-6)
    wanted = [float(value) for value in series([1.0], UNSTABLE[0], 40)]
    # growing as 1.2^n, so relative to the last: each of 40 frames rounds some ten operations by 2^-53
    np.testing.assert_allclose(response(diagram, 40, float), wanted, rtol=0, atol=400 * 2.0**-52 * abs(wanted[-1]))


def test_normalized_stages_refuse_what_is_not_stable() -> None:
    with pytest.raises(StructureError, match=r"k1 is -1\.0906, and a normalized stage needs \|k\| < 1"):
        drawn("lattice-normalized", [1.0], UNSTABLE[0])


@given(st.lists(DYADIC, min_size=1, max_size=12))
def test_step_down_takes_back_step_up_exactly(k: list[Fraction]) -> None:
    """k of 0 at the top shorten the polynomial."""
    while len(k) > 1 and k[-1] == 0:
        k = k[:-1]
    stages = list(step_down(tuple(step_up(k))))
    assert [stage[-1] for stage in reversed(stages)] == k
    assert [list(stage) for stage in reversed(stages)] == [step_up(k[:m]) for m in range(1, len(k) + 1)]


@given(st.lists(st.integers(-12, 12).map(lambda code: Fraction(code, 8)), min_size=1, max_size=8))
def test_all_k_below_1_is_stability(k: list[Fraction]) -> None:
    """Against the roots, where they are clear of the circle: numpy's are good to 1e-6 for such an order."""
    a = step_up(k)
    largest = max(np.abs(np.roots([float(value) for value in a])), default=0.0)
    if abs(largest - 1) > 1e-3:
        assert is_stable(tuple(a)) == (largest < 1) == all(abs(value) < 1 for value in k)


def test_rounded_stages_are_the_exact_ones() -> None:
    """Order 10, of coefficients with 53 bits: to multiples of 2^-512 against exact numbers."""
    a = tuple(Fraction(value) for value in np.poly(np.random.default_rng(3).uniform(-0.9, 0.9, 10)).tolist())
    for near, exact in zip(step_down(a, 512), step_down(a), strict=True):
        assert max(abs(x - y) for x, y in zip(near, exact, strict=True)) < Fraction(1, 1 << 400)


def test_an_all_pass_has_no_ladder_but_its_last_tap() -> None:
    """v of 0 is 0, and not what a long calculation leaves."""
    a = [1.0, -0.3, 0.11, 0.37]
    found = coefficients(drawn("lattice-ladder", a[::-1], a).diagram)
    assert [found[f"v{m}"] for m in range(4)] == [0.0, 0.0, 0.0, 1.0]


# --- what is drawn


@settings(max_examples=30)
@given(st.lists(DYADIC, min_size=1, max_size=4), st.lists(DYADIC, min_size=1, max_size=7))
def test_a_ladder_is_the_filter_exactly(k: list[Fraction], v: list[Fraction]) -> None:
    """Dyadic coefficients of few bits: A and B are exact in float64, so k and v must come back exactly."""
    k, v = [*k, Fraction(1, 2)], [*v, Fraction(3, 8)]
    a = step_up(k)
    b = [Fraction(0)] * len(v)
    for m, value in enumerate(v):
        backward = [Fraction(0)] * max(0, m - len(k)) + step_up(k[:m])[::-1]
        for i, term in enumerate(backward):
            b[i] += value * term
    diagram = drawn("lattice-ladder", [float(value) for value in b], [float(value) for value in a]).diagram
    found = coefficients(diagram)
    assert [Fraction(found[f"k{m}"]) for m in range(1, len(k) + 1)] == k
    assert [Fraction(found[f"v{m}"]) for m in range(len(v))] == v
    assert response(diagram, 30, Fraction) == series(map(float, b), map(float, a), 30)


@pytest.mark.parametrize("name", LATTICES)
@pytest.mark.parametrize("orders", [(0, 1), (1, 1), (0, 3), (2, 5), (5, 2), (4, 3), (3, 1)], ids=str)
def test_numerators_of_any_length(name: str, orders: tuple[int, int]) -> None:
    rng = np.random.default_rng(sum(orders))
    b = rng.uniform(-1, 1, orders[0] + 1).tolist()
    a = [float(value) for value in step_up([Fraction(float(k)) for k in rng.uniform(-0.6, 0.6, orders[1])])]
    diagram = drawn(name, b, a).diagram
    wanted = signal.lfilter(b, a, np.eye(1, 60)[0])
    np.testing.assert_allclose(response(diagram, 60, float), wanted, rtol=0, atol=rounding_bound(diagram))
    assert diagram.counts().delays == max(orders)


@pytest.mark.parametrize("name", LATTICES)
@pytest.mark.parametrize("decomposition", ["whole", "cascade"])
@settings(max_examples=8)
@given(st.integers(1, 12), st.integers(0, 2**32 - 1))
def test_stable_filters_in_float64_agree_with_scipy(name: str, decomposition: str, order: int, seed: int) -> None:
    filter = random_filter(order, seed)
    diagram = build(filter, form=name, decomposition=decomposition).diagram
    x = np.random.default_rng(seed).uniform(-1, 1, 60)
    found = [frame["output"] for frame in run(diagram, x.tolist(), float)]
    (factor,) = filter.factors
    wanted = signal.sosfilt(signal.zpk2sos(factor.zeros, factor.poles, factor.gain), x)
    np.testing.assert_allclose(found, wanted, rtol=0, atol=rounding_bound(diagram))


def test_a_zero_numerator_keeps_its_ladder_tap() -> None:
    diagram = drawn("lattice-ladder", [0.0], [1.0, 0.5, 0.25]).diagram
    assert coefficients(diagram)["v0"] == 0.0
    assert response(diagram, 8, Fraction) == [0] * 8


# --- counts


# Multiplications, additions, delays for M = N: textbook counts (Oppenheim & Schafer, ch. 6; Mitra; from memory) of the
# lattice-ladder and the normalized ladder. The one-multiplier lattice: N + N + 1 and 3N + N by construction.
COUNTS = {
    "lattice-ladder": lambda n: Counts(3 * n + 1, 3 * n, n),
    "lattice-one-multiplier": lambda n: Counts(2 * n + 1, 4 * n, n),
    "lattice-normalized": lambda n: Counts(5 * n + 1, 3 * n, n),
}
STORED = {"lattice-ladder": 2, "lattice-one-multiplier": 2, "lattice-normalized": 3}


@pytest.mark.parametrize("name", LATTICES)
@pytest.mark.parametrize("order", [1, 2, 3, 8])
def test_counts_of_order_n(name: str, order: int) -> None:
    built = build(random_filter(order, order), form=name, decomposition="whole")
    assert built.diagram.counts() == COUNTS[name](order)
    assert len(built.diagram.slots) == STORED[name] * order + 1
    assert len(lower(built.diagram, Fixed("Q8.24", coefficients={"bits": 32})).roundings) in (
        {2 * order + 1, 2 * order + 2} if name == "lattice-one-multiplier" else {2 * order + 1}
    )


def test_an_all_pole_lattice_of_two_multipliers() -> None:
    """2N multiplications, 2N additions, N delays (textbook count, from memory), which include g(N).

    Nothing reads g(N) here, so that one of each is not made, and the numerator's gain is one multiplication more.
    """
    n = 4
    assert drawn("lattice-ladder", [1.0], [1.0, 0.1, 0.2, 0.1, 0.3]).diagram.counts() == Counts(2 * n - 1 + 1, 2 * n - 1, n)


def test_two_multiplications_by_one_coefficient() -> None:
    builder = Builder()
    x = builder.input()
    gain = builder.gain(x, "k", 0.5)
    builder.output(builder.sum(gain, builder.again(gain, builder.delay("d", x))))
    diagram = builder.build()
    assert diagram.counts().multiplications == 2 and len(diagram.slots) == 1
    assert response(diagram, 3, float) == [0.5, 0.5, 0.0]
    with pytest.raises(DiagramError, match='"d" is a delay, and only a gain has a coefficient'):
        builder = Builder()
        builder.again(builder.delay("d"), builder.input())


# --- scaling


def node_norms(diagram: Diagram, letters: str) -> list[float]:
    """The L2 norm from the input to the nodes whose labels begin so."""
    nodes = [i for i, node in enumerate(diagram.nodes) if node.kind == "sum" and node.label[0] in letters]
    return norms_from_input(diagram, nodes=nodes).l2.tolist()


def covariance(diagram: Diagram) -> np.ndarray:
    """Of the states, for white input of power 1, by squaring."""
    space = diagram.state_space()
    a, k = space.A, space.B @ space.B.T
    for _ in range(20):
        k, a = k + a @ k @ a.T, a @ a
    return k


@pytest.mark.parametrize("order", [1, 2, 5, 9])
def test_states_of_normalized_stages_are_orthonormal(order: int) -> None:
    """The law of the form (Gray & Markel, 1975). Poles within 0.85: 1e-12 is some 50 roundings through 1 / (1 - 0.85)^2."""
    diagram = build(random_filter(order, 10 + order), form="lattice-normalized", decomposition="whole").diagram
    np.testing.assert_allclose(covariance(diagram), np.eye(order), rtol=0, atol=1e-12)
    v = [value for label, value in coefficients(diagram).items() if label[0] == "v"]
    power = norms_from_input(diagram, nodes=diagram.outputs).l2[0] ** 2
    assert sum(value * value for value in v) == pytest.approx(power, rel=1e-12)


@pytest.mark.parametrize("seed", range(12))
def test_no_node_of_one_multiplier_stages_has_more_power_than_the_input(seed: int) -> None:
    diagram = build(random_filter(1 + seed, seed), form="lattice-one-multiplier", decomposition="whole").diagram
    largest = max(node_norms(diagram, "fg"))
    shifted = any(node.kind == "shift" for node in diagram.nodes)
    assert (0.5 if shifted else 0.0) < largest <= 1 + 1e-12


def test_a_wrapping_overflow_dies_away_in_normalized_stages() -> None:
    """Rotations keep the energy of their inputs and a wrap lowers it (Gray & Markel, 1975). Granular cycles may stay.

    Each of the 2N roundings of half a step may keep up what N states shrink by: some 100 steps for poles within 0.85.
    """
    format = Fixed("Q1.15", coefficients={"bits": 32}, overflow="wrap")
    wrapped = 0
    for seed in range(8):
        diagram = build(random_filter(2 + seed % 4, seed), form="lattice-normalized", decomposition="whole").diagram
        x = np.zeros((800, 1))
        x[:40, 0] = np.random.default_rng(seed).choice([-1.0, 1.0 - 2.0**-15], 40)
        program = lower(diagram, format)
        y = run_definition(program, x)[:, 0, 0]
        ideal = run_definition(lower(diagram, named_format("float64")), x)[:, 0, 0]
        wrapped += bool(np.abs(y - ideal).max() > 0.1)
        assert np.abs(y[-100:]).max() <= 100 * 2.0**-15
    assert wrapped >= 4


# --- what is refused


@pytest.mark.parametrize("name", LATTICES)
def test_no_recursion_is_refused(name: str) -> None:
    with pytest.raises(StructureError, match="it has no recursion, and a lattice is made of"):
        drawn(name, [0.5, 0.25], [1.0])


@pytest.mark.parametrize("name", LATTICES)
def test_a_step_down_that_ends_early_is_refused(name: str) -> None:
    with pytest.raises(StructureError, match="reflection coefficient k2 is 1, where the step-down"):
        drawn(name, [1.0], [1.0, -1.5, 1.0])


@pytest.mark.parametrize("name", ["lattice-ladder", "lattice-one-multiplier"])
@pytest.mark.parametrize("pole", [1.0, -1.0])
def test_the_first_stage_may_have_a_pole_on_the_circle(name: str, pole: float) -> None:
    diagram = drawn(name, [0.5, 0.25], [1.0, -pole]).diagram
    assert response(diagram, 12, Fraction) == series([0.5, 0.25], [1.0, -pole], 12)
    inner = drawn(name, [0.5, 0.25, 1.0], [1.0, -0.5 * pole, -0.5]).diagram
    wanted = [float(value) for value in series([0.5, 0.25, 1.0], [1.0, -0.5 * pole, -0.5], 12)]
    assert response(inner, 12, float) == pytest.approx(wanted, abs=1e-14)  # 12 frames of some ten roundings of 2^-53


# --- drawings


@pytest.mark.parametrize("order", [1, 2, 4, 5, 8])
@pytest.mark.parametrize("name", LATTICES)
def test_a_lattice_wraps_on_the_page(name: str, order: int) -> None:
    """One crossing a stage cannot be avoided where two ways of a stage end on the other line than they come from."""
    for rounded in (False, True)[: 2 if order <= 5 else 1]:
        diagram = whole(name, order, order)
        marks = sums(diagram) if rounded else set()
        page = page_of(text := svg(diagram, rounded=marks))
        assert faults_of(text, diagram) == []
        assert [label.symbol.id for label in layout_of(diagram, marks).labels if label.hit] == []
        assert crossings(page) <= (0 if name == "lattice-normalized" else order)
        assert page.scale >= 0.8 and page.width_mm <= 180.0


@pytest.mark.parametrize("name", LATTICES)
@pytest.mark.parametrize("orders", [(2, 4), (6, 2), (0, 5)], ids=str)
def test_orders_that_differ_are_drawn(name: str, orders: tuple[int, int]) -> None:
    diagram = whole(name, *orders)
    assert faults_of(svg(diagram), diagram) == []


@pytest.mark.parametrize("name", LATTICES)
def test_many_sections_are_one_that_stands_for_all(name: str) -> None:
    diagram = cascade(name, 7)
    general = diagram.hints.general
    assert general is not None
    # rounded nodes are those of the whole diagram, and the section that stands for it has none
    assert faults_of(svg(diagram, rounded=sums(diagram)), general.diagram) == []


@pytest.mark.parametrize("odd", [False, True], ids=["even", "odd"])
@pytest.mark.parametrize("name", LATTICES)
def test_a_cascade_fits_the_page(name: str, odd: bool) -> None:
    diagram = cascade(name, 3, odd=odd, **({"scaling": "l2"} if name == "lattice-ladder" else {}))
    page = page_of(text := svg(diagram))
    assert faults_of(text, diagram) == []
    assert page.scale >= 0.8
