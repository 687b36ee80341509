"""Drawings of all forms: read back from their SVG they are the diagram, and nothing touches what it should not."""

import subprocess
import sys
from importlib import import_module

import pytest
from drawing_reader import crossings, faults_of, page_of
from drawn_forms import cascade, sums, whole
from form_filters import DIRECT

from streamhost.diagram import Diagram, Round, Sum, Taps
from streamhost.diagram.tapped import MOST_TAPS
from streamhost.drawing import layout_of, plain, svg
from streamhost.structures import form
from streamhost.structures.series import MOST_DRAWN

ORDERS = range(1, 13)
LEAST_SCALE = 0.8  # subscripts of 5.6 pt; smaller ones are hard to read in print (common practice)
WIDEST_MM = 180.0


def check_named(diagram: Diagram, rounded: set[int]) -> None:
    text = svg(diagram, rounded=rounded)
    page = page_of(text)
    assert faults_of(text, diagram) == []
    assert [label.symbol.id for label in layout_of(diagram, rounded).labels if label.hit] == []
    assert crossings(page) == 0
    assert page.scale >= LEAST_SCALE
    assert page.width_mm <= WIDEST_MM


@pytest.mark.parametrize("order", ORDERS)
@pytest.mark.parametrize("name", DIRECT)
def test_a_whole_form_is_drawn_as_it_is(name: str, order: int) -> None:
    check_named(whole(name, order, order), set())


@pytest.mark.parametrize("orders", [(0, 0), (0, 1), (1, 0), (0, 3), (3, 0), (5, 2), (2, 5), (2, 1), (1, 2)], ids=str)
@pytest.mark.parametrize("name", DIRECT)
def test_orders_that_differ(name: str, orders: tuple[int, int]) -> None:
    diagram = whole(name, *orders)
    check_named(diagram, set())
    check_named(diagram, sums(diagram))


@pytest.mark.parametrize("taps", [9, 13, 16, 20, MOST_TAPS])
@pytest.mark.parametrize("name", DIRECT)
def test_a_line_without_recursion_wraps_on_the_page(name: str, taps: int) -> None:
    diagram = whole(name, taps - 1, 0)
    check_named(diagram, set())
    check_named(diagram, sums(diagram))


@pytest.mark.parametrize("name", DIRECT)
def test_places_in_rows_change_no_node(name: str, monkeypatch: pytest.MonkeyPatch) -> None:
    lying = whole(name, 19, 0)
    monkeypatch.setattr(import_module("streamhost.structures.form"), "UPRIGHT", MOST_TAPS)
    upright = whole(name, 19, 0)
    assert lying.hints.places != upright.hints.places
    assert lying.nodes == upright.nodes
    assert lying.slots == upright.slots


@pytest.mark.parametrize("odd", [False, True], ids=["even", "odd"])
@pytest.mark.parametrize("sections", [2, 3, 5, MOST_DRAWN])
@pytest.mark.parametrize("name", DIRECT)
def test_a_cascade_wraps_on_the_page(name: str, sections: int, odd: bool) -> None:
    diagram = cascade(name, sections, odd=odd)
    check_named(diagram, set())
    if sections < MOST_DRAWN:
        check_named(diagram, sums(diagram))


@pytest.mark.parametrize("name", DIRECT)
def test_a_gain_in_front_has_its_place(name: str) -> None:
    diagram = cascade(name, 2, scaling="l2")
    check_named(diagram, set())


@pytest.mark.parametrize("name", DIRECT)
def test_a_long_cascade_is_one_section_with_all_values(name: str) -> None:
    diagram = cascade(name, MOST_DRAWN + 1)
    general = diagram.hints.general
    assert general is not None
    text = svg(diagram, rounded=sums(diagram))
    assert faults_of(text, general.diagram) == []
    assert "of 9 in series" in text
    assert {int(mark.split(".")[0]) for mark in page_of(text).marks} == sums(general.diagram)
    values = {f"{value:.6f}".replace("-", "\N{MINUS SIGN}") for value in diagram.values[:, 0]}
    assert all(f">{value}<" in text for value in values)


@pytest.mark.parametrize("orders", [(40, 40), (100, 0), (2, 30)], ids=str)
@pytest.mark.parametrize("name", DIRECT)
def test_a_long_section_is_one_row_with_all_values(name: str, orders: tuple[int, int]) -> None:
    diagram = whole(name, *orders)
    general = diagram.hints.general
    assert general is not None
    text = svg(diagram, rounded={index for index, node in enumerate(diagram.nodes) if isinstance(node, Sum | Taps)})
    assert faults_of(text, general.diagram) == []
    assert f"</tspan> = {max(orders)}.<" in text
    assert {int(mark.split(".")[0]) for mark in page_of(text).marks} == sums(general.diagram)
    values = {f"{value:.6f}" for value in diagram.values[:, 0]}
    assert all(f">{value}<" in text for value in values)


@pytest.mark.parametrize("name", DIRECT)
def test_a_section_that_marks_make_too_high_is_one_row(name: str) -> None:
    diagram = whole(name, 12, 12)
    general = diagram.hints.general
    assert general is not None
    assert faults_of(svg(diagram), diagram) == []
    text = svg(diagram, rounded=sums(diagram))
    assert page_of(text).scale >= LEAST_SCALE
    assert faults_of(text, general.diagram if name.startswith("transposed") else diagram) == []


@pytest.mark.parametrize("name", DIRECT)
def test_marks_stand_where_asked_and_not_before_a_drawn_rounding(name: str) -> None:
    diagram = cascade(name, 2)
    marked = {int(mark.split(".")[0]) for mark in page_of(svg(diagram, rounded=sums(diagram))).marks}
    shown_next = {index for index in sums(diagram) if all(isinstance(diagram.nodes[r], Round) for r in diagram.readers[index])}
    assert marked == sums(diagram) - shown_next
    assert page_of(svg(diagram)).marks == {}


def test_every_form_says_how_wide_it_is() -> None:
    for name in DIRECT:
        places = whole(name, 2, 2).hints.places
        assert places is not None
        columns = [place.at[0] for place in places.values()]
        # an input and an output 7/8 of a column outside
        assert max(columns) - min(columns) == form(name).width + 2 * 0.875


def test_a_minus_is_at_the_adder_and_not_at_the_coefficient() -> None:
    text = svg(whole("direct-1", 1, 1))
    assert len(page_of(text).minuses) == 1
    assert "\N{MINUS SIGN}</tspan>" not in text


def test_the_same_bytes_whatever_the_hash_seed() -> None:
    code = """
import sys
sys.path[:0] = ["tests"]
from random import Random
from random_diagrams import random_diagram
from drawn_forms import cascade
print(cascade("transposed-2", 3).svg(), random_diagram(Random(2), 12).svg())
"""
    runs = [subprocess.run([sys.executable, "-c", code], capture_output=True, check=True, env={"PYTHONHASHSEED": seed}).stdout
            for seed in ("0", "1", "12345")]
    assert runs[0] == runs[1] == runs[2]
    assert runs[0].startswith(b"<svg")


def test_plain_text_of_a_biquad() -> None:
    assert plain(whole("direct-2", 2, 2)).splitlines()[:9] == [
        "x[n] -->(+)===========*--[b0>--->(+)---> y[n]",
        "         ^            v           ^",
        "         |         [z^-1]         |",
        "         | -          |           |",
        "        (+)<===<a1]===*--[b1>--->(+)",
        "         ^ -          v           ^",
        "         |         [z^-1]         |",
        "         |            |           |",
        "         +=====<a2]===*--[b2>-----+",
    ]


def test_plain_text_of_a_line_whose_sum_runs_back() -> None:
    drawing = plain(whole("direct-1", 8, 0)).splitlines()
    assert drawing[0].startswith("x[n] -----------*->[z^-1]---*->")
    assert drawing[4].startswith("y[n] <---------(+)<--------(+)<-")


@pytest.mark.parametrize("name", DIRECT)
def test_plain_text_is_ascii_and_shows_every_symbol(name: str) -> None:
    diagram = cascade(name, 2)
    drawing = plain(diagram, values="none").rsplit("\n\n", 2)[0]
    assert drawing.isascii()
    assert drawing.count("z^-1") == sum(node.kind == "delay" for node in diagram.nodes)
    assert drawing.count("[Q]") == 1
    for slot in diagram.slots:
        assert slot.label.replace("_", "") in drawing
