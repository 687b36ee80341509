"""Drawings of the forms with error feedback, state spaces and summing registers, with and without marks of rounding."""

import pytest
from drawing_reader import crossings, faults_of, page_of

from streamhost import Filter, Fixed, Realization, realize
from streamhost.commands.draw import rounded_nodes
from streamhost.drawing import layout_of, plain, svg

# How many wires cross in a section of second order: e[n-1] goes past a1, and a12 crosses a21.
CROSSINGS = {
    "error-feedback-1": 0, "error-feedback-2": 1, "error-feedback-c1": 0, "error-feedback": 1, "normal": 1, "minimum-noise": 1,
    "delta": 0, "kingsbury": 0, "zoelzer": 0,
}
FIRST = [0.5, 0.25, 0.0, 1.0, -0.9, 0.0]
SECOND = [0.5, 0.25, 0.125, 1.0, -1.8, 0.85]


def realized(name: str, rows: list[list[float]]) -> Realization:
    return realize(Filter.from_sections(rows, rate=48000), form=name, format=Fixed("Q1.15", coefficients={"bits": 32}))


@pytest.mark.parametrize("marked", [False, True], ids=["plain", "marked"])
@pytest.mark.parametrize("rows", [[FIRST], [SECOND], [FIRST, SECOND, SECOND]], ids=["1", "2", "5"])
@pytest.mark.parametrize("name", CROSSINGS)
def test_nothing_touches_and_little_crosses(name: str, rows: list[list[float]], marked: bool) -> None:
    realization = realized(name, rows)
    diagram, rounded = realization.diagram, rounded_nodes(realization) if marked else frozenset()
    text = svg(diagram, rounded=rounded)
    assert faults_of(text, diagram) == []
    assert [label.symbol.id for label in layout_of(diagram, rounded).labels if label.hit] == []
    assert crossings(page_of(text)) == CROSSINGS[name] * rows.count(SECOND)
    assert page_of(text).scale >= 0.8


@pytest.mark.parametrize("name", CROSSINGS)
def test_plain_text_is_ascii(name: str) -> None:
    drawing = plain(realized(name, [SECOND]).diagram)
    assert drawing.isascii()
    if name == "delta":
        assert "[beta1>" in drawing and "<alpha1]" in drawing and "2^-" in drawing
