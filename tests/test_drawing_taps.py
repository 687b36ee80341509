"""Tapped lines drawn as the delays, gains and adders that they stand for."""


import numpy as np
import pytest
from diagram_evaluator import evaluate
from drawing_reader import crossings, faults_of, faults_of_figure, page_of
from drawn_forms import complementary, tapped
from hypothesis import given, settings
from hypothesis import strategies as st

from streamhost.diagram import Diagram, Taps
from streamhost.diagram.tapped import MOST_TAPS, written_out
from streamhost.drawing import layout_of, plain, svg

KINDS = ("plain", "last first", "even", "odd")
LENGTHS = (1, 2, 3, 4, 5, 8, 9, 13, MOST_TAPS)


@settings(max_examples=60, deadline=None)
@given(st.integers(2, MOST_TAPS), st.sampled_from(KINDS))
def test_what_is_written_out_computes_the_same(length: int, kind: str) -> None:
    diagram = tapped(length, kind)
    line, caption = written_out(diagram, 1, "x", "y")
    x = np.random.default_rng(length).integers(-1000, 1000, 3 * MOST_TAPS).astype(np.float64)
    assert caption == ""
    assert np.array_equal(evaluate(line, x)[:, line.outputs[0]], evaluate(diagram, x)[:, diagram.outputs[0]])
    assert line.counts().delays == diagram.counts().delays
    assert line.counts().multiplications == diagram.counts().multiplications


def added(line: Diagram) -> list[str]:
    """The coefficients of the products in the order in which they are added."""
    result = line.nodes[line.nodes[line.outputs[0]].reads[0]]
    return [line.slots[line.nodes[source].coefficient].label for source in result.reads]  # type: ignore[attr-defined]


@pytest.mark.parametrize("kind", KINDS)
def test_it_is_written_out_in_the_order_of_addition(kind: str) -> None:
    line = written_out(tapped(8, kind), 1, "x", "y")[0]
    names = [f"h{k}" for k in range(len(line.slots))]
    assert added(line) == (names[::-1] if kind == "last first" else names)


@pytest.mark.parametrize("kind", KINDS)
def test_every_length_is_drawn_as_it_is(kind: str) -> None:
    for length in LENGTHS[kind == "odd" :]:
        diagram = tapped(length, kind)
        line = written_out(diagram, 1, "x", "y")[0]
        text = svg(diagram)
        page = page_of(text)
        assert faults_of(text, line) == [], length
        assert layout_of(line).is_clear, length
        # Folded, each product but the innermost must cross the way back to reach the sums.
        products = len(diagram.slots)
        inner = 1 if length % 2 == 0 or kind == "even" or products == 1 else 0
        assert crossings(page) == (products - inner if kind in ("even", "odd") else 0), length
        assert page.width_mm <= 180.0
        assert page.scale >= 0.8  # subscripts of 5.6 pt; smaller ones are hard to read in print (common practice)


@pytest.mark.parametrize("kind", KINDS[:3])
def test_one_tap_is_a_gain_on_the_way(kind: str) -> None:
    text = svg(tapped(1, kind))
    assert all(start[1] == end[1] for start, end in page_of(text).lines)


@pytest.mark.parametrize("kind", KINDS)
@pytest.mark.parametrize("length", [MOST_TAPS + 1, MOST_TAPS + 2, 300])
def test_a_longer_line_is_three_taps_that_stand_for_all(length: int, kind: str) -> None:
    diagram = tapped(length, kind)
    line, caption = written_out(diagram, 1, "x", "y")
    text = svg(diagram)
    assert faults_of(text, line) == []
    assert f"N = {len(diagram.slots) - 1}." in caption
    assert "stands for all" in text
    assert {slot.label for slot in line.slots} == {"h0", "h_k", "h_N"}
    assert all(f">{value:.6f}<" in text for value in diagram.values[:, 0])


def test_among_other_nodes_it_is_a_box_and_written_out_below() -> None:
    diagram = complementary()
    text = svg(diagram)
    assert [box.kind for box in page_of(text).boxes].count("taps") == 1
    assert faults_of_figure(text, diagram) == []
    assert [box.kind for box in page_of(text, 0).boxes].count("gain") == 3
    assert "h0 ... h4 from x[n] to h[n]:" in plain(diagram)


def test_a_rounded_line_has_its_mark_at_its_sum() -> None:
    diagram = tapped(6, "even")
    (taps,) = (index for index, node in enumerate(diagram.nodes) if isinstance(node, Taps))
    line = written_out(diagram, taps, "x", "y")[0]
    text = svg(diagram, rounded={taps})
    assert faults_of(text, line) == []
    (mark,) = page_of(text).marks
    assert int(mark.split(".")[0]) == line.nodes[line.outputs[0]].reads[0]
