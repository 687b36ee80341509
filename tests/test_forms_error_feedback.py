"""direct-1 with error feedback: what it draws, what it does to the noise, and where it equals other forms bit for bit."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from low_noise_forms import in_float64, poles_at, random_filter, rounding_gain, section

from streamhost import Filter, Fixed, design, realize
from streamhost.diagram import Builder, Counts, Diagram, minus
from streamhost.errors import StructureError
from streamhost.measure import measure
from streamhost.program.run import lower, run_definition
from streamhost.signals import white
from streamhost.structures import build, form

ALL = ("error-feedback-1", "error-feedback-2", "error-feedback-c1", "error-feedback")
RATE = 48000
B = [0.06, -0.03, 0.05]
SEEDS = st.integers(0, 2**32 - 1)


def labels(filter: Filter, name: str) -> list[str]:
    return [slot.label for slot in build(filter, form=name).diagram.slots]


# --- what is drawn


@pytest.mark.parametrize(
    ("name", "counts"),
    [("error-feedback-1", Counts(5, 5, 5)), ("error-feedback-2", Counts(5, 6, 6)), ("error-feedback-c1", Counts(6, 5, 5)),
     ("error-feedback", Counts(7, 6, 6))],
)
def test_a_biquad_has_the_stated_counts_and_one_rounding(name: str, counts: Counts) -> None:
    """direct-1 has 5, 4, 4 (Oppenheim & Schafer, ch. 6); a word and an addition for each e[n-k], a product for each c_k."""
    filter = section(B, poles_at(0.9, 0.3))
    assert build(filter, form=name).diagram.counts() == counts
    stated = f"a second-order section {counts.multiplications}, {counts.additions}, {counts.delays}"
    assert stated in form(name).docs.replace("\n", " ")
    program = realize(filter, form=name, format=Fixed("Q1.15", coefficients="Q2.14")).program
    assert len(program.roundings) == 1


def test_terms_are_added_row_by_row_b_a_then_c() -> None:
    """b2 x2 - a2 y2 - c2 e2 + b1 x1 - a1 y1 - c1 e1 + b0 x: the order that the arithmetic's specification fixes."""
    diagram = build(section(B, poles_at(0.9, 0.3)), form="error-feedback").diagram
    y = next(node for node in diagram.nodes if node.label == "y")
    assert [(term.sign, diagram.nodes[term.source].label) for term in y.terms] == [
        (1, "b2"), (-1, "a2"), (-1, "c2"), (1, "b1"), (-1, "a1"), (-1, "c1"), (1, "b0"),
    ]
    assert {slot.part for slot in diagram.slots if slot.label in ("c1", "c2")} == {"c"}


def fed_back(a: list[float], name: str) -> list[tuple[int, str, int]]:
    """(sign, kind of what the sum reads, its shift) of the terms that error feedback adds."""
    diagram = build(section(B, a), form=name).diagram
    y = next(node for node in diagram.nodes if node.label == "y")
    found = []
    for term in y.terms:
        node = diagram.nodes[term.source]
        if node.kind != "gain":
            found.append((term.sign, node.label if node.kind == "delay" else node.kind, getattr(node, "k", 0)))
    return found


def test_zeros_of_c_go_to_the_end_of_the_circle_that_a_pole_is_nearer_to() -> None:
    low, high, both = poles_at(0.9, 0.3), poles_at(0.9, 2.9), [1.0, -0.1, -0.8]
    assert fed_back(low, "error-feedback-1") == [(1, "e1", 0)]  # C = 1 - z^-1
    assert fed_back(high, "error-feedback-1") == [(-1, "e1", 0)]  # C = 1 + z^-1
    assert fed_back(low, "error-feedback-2") == [(-1, "e2", 0), (1, "shift", 1)]  # C = (1 - z^-1)^2
    assert fed_back(high, "error-feedback-2") == [(-1, "e2", 0), (-1, "shift", 1)]
    assert fed_back(both, "error-feedback-2") == [(1, "e2", 0)]  # poles 0.95 and -0.85: C = 1 - z^-2
    assert fed_back([1.0, -0.9], "error-feedback-2") == [(1, "e1", 0)]  # one pole, one zero


@pytest.mark.parametrize("name", ALL)
def test_without_recursion_it_is_direct_1(name: str) -> None:
    diagram = build(section(B, [1.0]), form=name).diagram
    assert diagram.hash == build(section(B, [1.0]), form="direct-1").diagram.hash


# --- the noise


# Higgins & Munson 1982, Abu-El-Haija & Peterson 1979, Dattorro 1988; from memory, recomputed as power sums of C / A.
PUBLISHED = [
    # r, theta, C = 1, C = 1 - z^-1, best c1, with it, C = (1 - z^-1)^2, C = A
    (0.99, 0.130899694, 1480.9521, 25.4878, -0.991394791, 25.3781, 1.448706, 1.0),
    (0.95, 0.3, 60.081, 5.5177, -0.954081119, 5.391, 1.557982, 1.0),
]


@pytest.mark.parametrize(("radius", "angle", "plain", "one", "c1", "best", "two", "all"), PUBLISHED)
def test_noise_gains_are_the_published_ones(
    radius: float, angle: float, plain: float, one: float, c1: float, best: float, two: float, all: float
) -> None:
    filter = section([1.0], poles_at(radius, angle))
    # four to eight digits are given
    for name, gain in (("direct-1", plain), ("error-feedback-1", one), ("error-feedback-c1", best), ("error-feedback-2", two)):
        assert rounding_gain(filter, name) == pytest.approx(gain, rel=1e-5), name
    assert rounding_gain(filter, "error-feedback") == pytest.approx(all, rel=1e-12)
    diagram = build(filter, form="error-feedback-c1").diagram
    (value,) = (row[0] for slot, row in zip(diagram.slots, diagram.values, strict=True) if slot.label == "c1")
    assert value == pytest.approx(c1, abs=1e-9)


@settings(max_examples=25)
@given(st.floats(0.05, 0.97), st.floats(0.05, 3.05), st.floats(-1.5, 1.5))
def test_no_c1_is_better_than_the_best(radius: float, angle: float, other: float) -> None:
    """And its gain is 1 / (1 - a2^2), whatever the angle (Higgins & Munson 1982, from memory)."""
    a = poles_at(radius, angle)
    best = rounding_gain(section([1.0], a), "error-feedback-c1")
    assert best == pytest.approx(1.0 / (1.0 - a[2] ** 2), rel=1e-9)
    from scipy import signal

    impulse = np.eye(1, 2000)[0]
    assert np.sum(signal.lfilter([1.0, other], a, impulse) ** 2) >= best * (1.0 - 1e-9)


@settings(max_examples=25)
@given(st.integers(1, 2), SEEDS)
def test_the_whole_denominator_makes_every_rounding_white(order: int, seed: int) -> None:
    filter = random_filter(order, seed)
    assert rounding_gain(filter, "error-feedback") == pytest.approx(1.0, rel=1e-9)


@settings(max_examples=10)
@given(st.floats(0.3, 0.97), st.floats(0.05, 1.5))
def test_high_frequencies_mirror_low_ones(radius: float, angle: float) -> None:
    a = poles_at(radius, angle)
    mirrored = [1.0, -a[1], a[2]]
    for name in ALL:
        low, high = (rounding_gain(section([1.0], each), name) for each in (a, mirrored))
        assert low == pytest.approx(high, rel=1e-9)


@pytest.mark.parametrize("name", ["error-feedback-1", "error-feedback-2"])
@settings(max_examples=25)
@given(st.floats(0.05, 0.97), st.floats(0.02, 3.12))
def test_a_hazard_is_said_where_the_noise_grows_by_a_decibel(name: str, radius: float, angle: float) -> None:
    filter = section([1.0], poles_at(radius, angle))
    change = 10.0 * np.log10(rounding_gain(filter, name) / rounding_gain(filter, "direct-1"))
    said = [sentence for sentence in build(filter, form=name).hazards if "louder than in direct-1" in sentence]
    # the norms in the sentence have 24 bits
    assert change > 1.0 - 1e-5 if said else change < 1.0 + 1e-5
    if said:
        assert float(said[0].split(" dB louder")[0].split()[-1]) == pytest.approx(change, abs=0.05 + 1e-5)


# --- bit for bit


@pytest.mark.parametrize("name", ALL)
@settings(max_examples=15)
@given(st.integers(1, 12), SEEDS)
def test_in_float64_it_is_direct_1_bit_for_bit(name: str, order: int, seed: int) -> None:
    """There a rounding drops nothing that is fed back; direct-1 itself is held against scipy."""
    filter = random_filter(order, seed)
    x = np.random.default_rng(seed).uniform(-1, 1, 60)
    found = in_float64(build(filter, form=name).diagram, x)
    np.testing.assert_array_equal(found, in_float64(build(filter, form="direct-1").diagram, x))


def explicit(a: list[float], c: list[float]) -> Diagram:
    """direct-1 of second order with -c_k e_k as products, in the same order."""
    d = Builder()
    x = d.input()
    x1 = d.delay("x1", x)
    x2 = d.delay("x2", x1)
    y1 = d.delay("y1")
    y2 = d.delay("y2", y1)
    e1 = d.delay("e1")
    e2 = d.delay("e2", e1)
    rows = [(d.gain(bx, f"b{k}", B[k], section=0, part="b"), minus(d.gain(y, f"a{k}", a[k], section=0, part="a")),
             minus(d.gain(e, f"c{k}", c[k], section=0, part="c"))) for k, bx, y, e in ((2, x2, y2, e2), (1, x1, y1, e1))]
    y = d.sum(*rows[0], *rows[1], d.gain(x, "b0", B[0], section=0, part="b"), label="y")
    y1.takes(y)
    e1.takes(d.residue(y))
    d.output(y)
    return d.build()


FORMATS = [Fixed("Q1.15", coefficients="Q3.13"), Fixed("Q1.15", coefficients="Q3.13", accumulator=40, rounding="floor"),
           Fixed("Q1.15", coefficients="Q3.13", accumulator={"bits": 32, "drop": 4}, product=20)]


@pytest.mark.parametrize("format", FORMATS, ids=["full", "40 bits", "drop and product"])
@pytest.mark.parametrize(("name", "c"), [("error-feedback-1", [1.0, -1.0, 0.0]), ("error-feedback-2", [1.0, -2.0, 1.0])])
def test_a_wire_and_a_shift_are_what_products_by_1_and_2_are(name: str, c: list[float], format: Fixed) -> None:
    a = poles_at(0.9, 0.3)
    x = np.random.default_rng(3).uniform(-1, 1, (300, 1))
    drawn, written = (lower(diagram, format) for diagram in (build(section(B, a), form=name).diagram, explicit(a, c)))
    np.testing.assert_array_equal(run_definition(drawn, x), run_definition(written, x))


@settings(max_examples=25)
@given(SEEDS, st.sampled_from(["half-up", "half-even", "half-away", "floor", "toward-zero"]))
def test_c_equal_to_a_is_direct_1_with_state_and_operand_at_the_accumulators_word(seed: int, rounding: str) -> None:
    """Where nothing overflows and no product is cut: the residue is what the longer word would have kept."""
    rng = np.random.default_rng(seed)
    filter = section(B, poles_at(rng.uniform(0.3, 0.97), rng.uniform(0.05, 3.0)))
    same_sums: dict[str, object] = {"coefficients": "Q2.14", "rounding": rounding, "accumulator": "Q8.27"}
    wide = Fixed("Q2.13", state="Q2.27", operand="Q2.27", **same_sums)  # type: ignore[arg-type]
    shaped = Fixed("Q2.13", **same_sums)  # type: ignore[arg-type]
    x = rng.uniform(-0.4, 0.4, (300, 1))
    y = run_definition(lower(build(filter, form="error-feedback").diagram, shaped), x)
    assert np.abs(y).max() < 2.0, "nothing overflows"
    np.testing.assert_array_equal(y, run_definition(lower(build(filter, form="direct-1").diagram, wide), x))


# --- refusals


@pytest.mark.parametrize("name", ALL)
def test_a_higher_order_is_refused(name: str) -> None:
    with pytest.raises(StructureError, match="it is of order 3, and error feedback is drawn for sections of first and second"):
        build(random_filter(3, 1), form=name, decomposition="whole")
    assert build(random_filter(3, 1), form=name).decomposition == "cascade"


def test_no_c1_is_best_for_a_pole_on_the_circle_and_the_others_carry_it() -> None:
    oscillator = section(B, [1.0, -1.0, 1.0])
    with pytest.raises(StructureError, match="where no c1 makes the noise least"):
        build(oscillator, form="error-feedback-c1")
    for name in set(ALL) - {"error-feedback-c1"}:
        assert build(oscillator, form=name).hazards == ()


# --- measured


def test_predicted_noise_is_measured_at_100_hz() -> None:
    """4 s at Q1.15. The floors of the products c_k e are too small to hinder the verdict on the white model."""
    filter = design("low-pass", rate=RATE, frequency=100, q=0.707)
    realization = realize(filter, form="error-feedback", format=Fixed("Q1.15", coefficients={"bits": 32}))
    measured = measure(realization, white(4 * RATE, 1, 1, -10.0), (20.0, 20000.0))
    assert measured.white.holds is True, measured.white.reason
    assert measured.noise.dbfs == pytest.approx(measured.prediction.dbfs, abs=max(0.5, measured.noise.interval_db))
