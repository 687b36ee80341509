"""Writing diagrams down: what is recorded, what is refused on the spot, and the hash of what resulted."""

from collections.abc import Callable

import numpy as np
import pytest

from streamhost.diagram import Builder, Diagram, Ref, Sum, Taps, Term, minus
from streamhost.errors import DiagramError


def test_the_example_of_the_module() -> None:
    b = Builder()
    x = b.input()
    d = b.delay("d1")
    y = b.sum(x, b.gain(d, "k", 0.9), label="y")
    d.takes(y)
    b.output(y)
    diagram = b.build()
    assert [node.label for node in diagram.nodes] == ["x", "d1", "k", "y", "y"]
    assert diagram.inputs == (0,)
    assert diagram.outputs == (4,)
    assert diagram.nodes[3] == Sum("y", (Term(1, 0), Term(1, 2)))
    assert diagram.values.tolist() == [[0.9]]


def test_signs_and_order_of_terms_are_kept() -> None:
    b = Builder()
    x, z = b.input("x"), b.input("z")
    b.output(b.sum(minus(z), x, minus(x), label="s"))
    assert b.build().nodes[2] == Sum("s", (Term(-1, 1), Term(1, 0), Term(-1, 0)))


def test_equal_labels_are_numbered_and_slots_keep_the_given_name() -> None:
    b = Builder()
    x = b.input()
    b.output(b.sum(b.gain(x, "g", 1.0), b.gain(x, "g", 2.0), b.gain(x, "g", 3.0)))
    diagram = b.build()
    assert [node.label for node in diagram.nodes] == ["x", "g", "g_2", "g_3", "sum", "y"]
    assert [slot.label for slot in diagram.slots] == ["g", "g", "g"]


def test_coefficients_have_a_channel_axis_and_single_numbers_are_for_all() -> None:
    b = Builder()
    x = b.input()
    b.output(b.sum(b.gain(x, "left and right", [0.5, 0.25]), b.gain(x, "both", 2.0)))
    diagram = b.build()
    assert diagram.channels == 2
    assert diagram.values.tolist() == [[0.5, 0.25], [2.0, 2.0]]


def test_without_coefficients_there_is_one_channel() -> None:
    b = Builder()
    b.output(b.input())
    assert b.build().values.shape == (0, 1)


def test_with_values_keeps_the_graph() -> None:
    b = Builder()
    b.output(b.gain(b.input(), "g", 1.0))
    diagram = b.build()
    changed = diagram.with_values(np.array([[2.0, 3.0]]))
    assert changed.nodes is diagram.nodes
    assert changed.channels == 2
    assert diagram.values.tolist() == [[1.0]]


def test_slots_carry_section_part_and_feedback() -> None:
    b = Builder()
    b.output(b.gain(b.input(), "a1", 1.0, section=3, part="a", feedback=True))
    slot = b.build().slots[0]
    assert (slot.label, slot.section, slot.part, slot.feedback) == ("a1", 3, "a", True)


@pytest.mark.parametrize(("values", "fold", "kept"), [
    ([1, 2, 3], None, [1, 2, 3]),
    ([1, 2, 2, 1], "even", [1, 2]),
    ([1, 2, 3, 2, 1], "even", [1, 2, 3]),
    ([1, 2, -2, -1], "odd", [1, 2]),
    ([1, 2, 0, -2, -1], "odd", [1, 2]),
])
def test_taps_store_one_coefficient_a_pair(values: list[float], fold: str | None, kept: list[float]) -> None:
    b = Builder()
    b.output(b.taps(b.input(), "h", values, fold=fold))
    diagram = b.build()
    taps = diagram.nodes[1]
    assert isinstance(taps, Taps)
    assert taps.length == len(values)
    assert diagram.values[:, 0].tolist() == kept
    assert [slot.label for slot in diagram.slots] == [f"h{i}" for i in range(len(kept))]


def test_taps_added_last_first_store_their_coefficients_in_that_order() -> None:
    b = Builder()
    b.output(b.taps(b.input(), "h", [1, 2, 3], last_first=True))
    diagram = b.build()
    assert diagram.values[:, 0].tolist() == [3, 2, 1]
    assert [slot.label for slot in diagram.slots] == ["h2", "h1", "h0"]


REFUSED: dict[str, tuple[Callable[[Builder, Ref], object], str]] = {
    "two outputs of a name": (
        lambda b, x: [b.output(x, "y"), b.output(x, "y")],
        'Two outputs are named "y". Each output has a name of its own.'),
    "a delay driven twice": (
        lambda b, x: b.delay("d", x).takes(x),
        'The delay "d" is driven twice.'),
    "a sum driven later": (
        lambda b, x: b.sum(x, label="s").takes(x),
        '"s" is a sum, and only a delay is driven later.'),
    "a node of another builder": (
        lambda b, x: b.gain(Builder().input(), "g", 1.0),
        "A node of another diagram was used here. Nodes belong to the builder that made them."),
    "a coefficient that is no number": (
        lambda b, x: b.gain(x, "g", float("nan")),
        'The coefficient "g" = nan is not a finite number, or one per channel.'),
    "a coefficient with two axes": (
        lambda b, x: b.gain(x, "g", [[1.0]]),
        'The coefficient "g" = [[1.0]] is not a finite number, or one per channel.'),
    "saturation on a marked sum": (
        lambda b, x: b.sum(x, label="s", grow=3, overflow="saturate"),
        ('The sum "s" is marked grow = 3 with overflow = "saturate": a longer register of a running sum is exact only '
         "where it wraps. Saturation there is refused.")),
    "an unknown fold": (
        lambda b, x: b.taps(x, "h", [1, 1], fold="both"),
        """fold = 'both' of the taps "h" is not known: "even" or "odd" symmetry."""),
    "taps without the symmetry": (
        lambda b, x: b.taps(x, "h", [1, 2, 3], fold="even"),
        'The taps "h" have no even symmetry: tap 0 is 1, tap 2 is 3.'),
    "a middle tap of odd symmetry": (
        lambda b, x: b.taps(x, "h", [1, 2, -1], fold="odd"),
        'The taps "h" have odd symmetry and a middle tap of 2: it must be 0.'),
    "folded taps last first": (
        lambda b, x: b.taps(x, "h", [1, 1], fold="even", last_first=True),
        'The taps "h" are folded: pairs are added from both ends inwards, never last first.'),
}


@pytest.mark.parametrize("case", REFUSED)
def test_what_is_refused_on_the_spot(case: str) -> None:
    builder = Builder()
    x = builder.input()
    mistake, message = REFUSED[case]
    with pytest.raises(DiagramError) as error:
        mistake(builder, x)
    assert str(error.value) == message


def test_coefficients_for_different_numbers_of_channels_are_refused() -> None:
    b = Builder()
    x = b.input()
    b.output(b.sum(b.gain(x, "g", [1.0, 2.0]), b.gain(x, "h", [1.0, 2.0, 3.0])))
    with pytest.raises(DiagramError, match=r'coefficient "g" has 2 values, and others have 3: give one, or one per'):
        b.build()


# --- the hash


def built(change: str = "") -> Diagram:
    b = Builder()
    x = b.input()
    d = b.delay("d", n=2 if change == "delay" else 1)
    label = "other" if change == "label" else "g"
    g = b.gain(d, label, 0.75 if change == "value" else [0.5, 0.5] if change == "channels" else 0.5)
    s = b.shift(g, 2 if change == "shift" else 1)
    terms = [x, minus(s) if change == "sign" else s]
    y = b.sum(*reversed(terms)) if change == "order" else b.sum(*terms, grow=3 if change == "mark" else None)
    t = b.taps(y, "h", [1.0, 1.0], fold="even" if change == "fold" else None)
    d.takes(x if change == "wire" else y)
    b.output(t, "z" if change == "output" else "y")
    return b.build()


@pytest.mark.parametrize("change", ["", "value", "channels"])
def test_hash_is_equal_for_equal_graphs_whatever_the_values(change: str) -> None:
    assert built(change).hash == built().hash


def test_hash_differs_for_every_change_of_the_graph() -> None:
    changes = ["", "delay", "label", "shift", "sign", "order", "mark", "fold", "wire", "output"]
    assert len({built(change).hash for change in changes}) == len(changes)
