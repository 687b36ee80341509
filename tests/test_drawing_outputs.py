"""Drawings of several outputs, below each other: read back from their SVG they are the diagram."""

import pytest
from drawing_reader import crossings, faults_of, page_of
from form_filters import DIRECT

from streamhost.diagram import Diagram, Sum
from streamhost.drawing import layout_of, plain, svg
from streamhost.drawing.table import value_table
from streamhost.drawing.text import coefficient
from streamhost.drawing.text import plain as words
from streamhost.filters import Filter, design
from streamhost.structures import build

RATE = 48000
BAND = design("peak", rate=RATE, frequency=500, gain_db=6, q=1)
KINDS = {
    "first order": ("butterworth-crossover", {"order": 1, "frequency": 2000}),
    "third order": ("butterworth-crossover", {"order": 3, "frequency": 2000}),
    "second order": ("linkwitz-riley", {"order": 2, "frequency": 2000}),
    "fourth order": ("linkwitz-riley", {"order": 4, "frequency": 2000}),
    "sixth order": ("linkwitz-riley", {"order": 6, "frequency": 2000}),
    "eighth order": ("linkwitz-riley", {"order": 8, "frequency": 2000}),
}
LEAST_SCALE = 0.75
"""Subscripts of 5.3 pt: the names of outputs make labels longer, and the bus that leads to them takes a quarter column."""


def drawn(name: str, kind: str, common: int, decomposition: str = "cascade", scaling: str = "none") -> Diagram:
    """A crossover behind so many bands."""
    filter = Filter.cascade([*[BAND] * common, design(KINDS[kind][0], rate=RATE, **KINDS[kind][1])])
    return build(filter, form=name, decomposition=decomposition, scaling=scaling).diagram


def check(diagram: Diagram, rounded: set[int]) -> None:
    assert diagram.hints.general is None
    text = svg(diagram, rounded=rounded)
    assert faults_of(text, diagram) == []
    assert [label.symbol.id for label in layout_of(diagram, rounded).labels if label.hit] == []
    page = page_of(text)
    assert crossings(page) == 0
    assert page.width_mm <= 180.0
    if not rounded:
        assert page.scale >= LEAST_SCALE


@pytest.mark.parametrize("common", [0, 1, 2])
@pytest.mark.parametrize("kind", ["first order", "fourth order"])
@pytest.mark.parametrize("name", DIRECT)
def test_outputs_stand_below_each_other(name: str, kind: str, common: int) -> None:
    diagram = drawn(name, kind, common)
    check(diagram, set())
    low, high = (next(p.at for i, p in (diagram.hints.places or {}).items() if diagram.nodes[i].label == output
                      and diagram.nodes[i].kind == "output") for output in ("low", "high"))
    assert low[0] == high[0] and low[1] < high[1]


@pytest.mark.parametrize("name", DIRECT)
def test_a_gain_in_front_of_every_part_has_its_place(name: str) -> None:
    check(drawn(name, "third order", 1, scaling="l2"), set())


@pytest.mark.parametrize("name", ["direct-2", "transposed-2"])
def test_outputs_that_take_several_rows(name: str) -> None:
    check(drawn(name, "sixth order", 0), set())
    check(drawn(name, "eighth order", 0), set())


@pytest.mark.parametrize("name", ["direct-1", "transposed-1"])
def test_marks_and_undivided_outputs(name: str) -> None:
    diagram = drawn(name, "second order", 1, decomposition="whole")
    check(diagram, {index for index, node in enumerate(diagram.nodes) if isinstance(node, Sum)})


def test_too_many_sections_are_one_that_stands_for_all() -> None:
    diagram = drawn("direct-1", "eighth order", 1)
    general = diagram.hints.general
    assert general is not None
    text = svg(diagram)
    assert faults_of(text, general.diagram) == []
    assert general.caption == (
        "Section i in place of all, each rounded before the next, x_i+1 = y_i: 1 for all outputs, 4 to low, 4 to high.")


def test_long_outputs_are_rows_that_stand_for_all() -> None:
    filter = design("complementary", rate=RATE, taps=99, frequency=3000, window="hann")
    diagram = build(filter, form="transposed-2", decomposition="whole").diagram
    general = diagram.hints.general
    assert general is not None
    assert faults_of(svg(diagram), general.diagram) == []
    last = len(filter.output("low").whole()[0]) - 1
    assert general.caption == f"The row of k stands for all rows k = 1 to {last - 1}, one delay apart; N = {last}."
    assert {"b0_low", "b_k_low", "b_N_high"} <= {slot.label for slot in general.diagram.slots}


def test_names_of_outputs_are_subscripts() -> None:
    shown = {name: words(coefficient(name)) for name in ("b0_low_1", "a2_high", "g_low", "b_k_low", "b0_1", "b_N")}
    assert shown == {"b0_low_1": "b0,low,1", "a2_high": "a2,high", "g_low": "glow", "b_k_low": "bk,low", "b0_1": "b01",
                     "b_N": "bN"}
    assert words(coefficient("feed_back")) == "feed_back"


def test_the_table_names_the_outputs_and_the_channels() -> None:
    filters = [Filter.cascade([BAND, design("linkwitz-riley", rate=RATE, order=4, frequency=f)]) for f in (1000, 2000)]
    one = value_table(build(filters[0], form="direct-2", scaling="l2").diagram)
    assert one is not None
    assert [words(row[0]) for row in one.rows] == ["1", "low 1", "low 2", "high 1", "high 2"]
    assert [words(head) for head in one.heads] == ["section", "g", "b0", "b1", "b2", "a1", "a2"]
    both = value_table(build(filters, form="direct-1").diagram)
    assert both is not None
    assert [(words(row[0]), words(row[1])) for row in both.rows] == [
        (section, channel) for section in ("1", "low 1", "low 2", "high 1", "high 2") for channel in ("1", "2")]


def test_plain_text_shows_both_outputs() -> None:
    lines = plain(drawn("direct-2", "first order", 0)).splitlines()
    assert sum(line.endswith("-> low[n]") for line in lines) == 1
    assert sum(line.endswith("-> high[n]") for line in lines) == 1
    assert lines[0].startswith("x[n] --*")
