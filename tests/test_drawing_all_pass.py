"""Drawings of the forms that are half the sum of two all-passes, and of the outputs that forms offer beside the main one."""

import pytest
from drawing_reader import crossings, faults_of, page_of

from streamhost import Filter, design
from streamhost.diagram import Diagram, Sum
from streamhost.drawing import layout_of, svg
from streamhost.structures import build

RATE = 48000


def low_pass(order: int, frequency: float = 1000.0) -> Filter:
    return design("butterworth", rate=RATE, response="low-pass", order=order, frequency=frequency)


def check(diagram: Diagram, crossed: int, least_scale: float = 0.8) -> None:
    """Plain and with a mark on every sum: the diagram itself, nothing touching, no more crossings than said."""
    for rounded in (set(), {index for index, node in enumerate(diagram.nodes) if isinstance(node, Sum)}):
        text = svg(diagram, rounded=rounded)
        assert faults_of(text, diagram) == []
        assert [label.symbol.id for label in layout_of(diagram, rounded).labels if label.hit] == []
        assert crossings(page_of(text)) <= crossed
        assert page_of(text).scale >= least_scale


@pytest.mark.parametrize("order", [1, 3, 7])
@pytest.mark.parametrize("name", ["all-pass-sum", "wave-digital"])
def test_a_section_of_second_order_crosses_once(name: str, order: int) -> None:
    """c2's wire passes y[n-1]; in a port the two waves that are multiplied pass the product, unless g is above 1/2."""
    check(build(low_pass(order), form=name, decomposition="whole").diagram, order // 2)


@pytest.mark.parametrize("name", ["all-pass-sum", "wave-digital"])
def test_half_band_filters_and_notches(name: str) -> None:
    notch = design("notch", rate=RATE, frequency=500, q=5)
    for filter in (low_pass(3, 12000.0), low_pass(5, 12000.0), notch):
        check(build(filter, form=name, decomposition="whole").diagram, 2)


@pytest.mark.parametrize(("name", "order", "crossed"), [
    ("all-pass-sum", 3, 2), ("wave-digital", 3, 2), ("state-variable", 1, 0), ("state-variable", 2, 1),
    ("state-variable-delayed", 1, 0), ("state-variable-delayed", 2, 1),
])  # fmt: skip
def test_outputs_that_are_offered_have_their_places(name: str, order: int, crossed: int) -> None:
    diagram = build(low_pass(order), form=name, decomposition="whole", outputs="all").diagram
    assert len(diagram.outputs) > 1
    assert diagram.hints.places_for(diagram.nodes) is not None
    check(diagram, crossed)
