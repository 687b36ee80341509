"""Drawings of diagrams whose maker gave no places, and what the reader of drawings must catch."""

from random import Random

import diagram_examples as examples
import pytest
from drawing_reader import crossings, edges_of, expected_edges, faults_of_figure, faults_of_joints, page_of
from random_diagrams import random_diagram

from streamhost.diagram import Builder, Diagram, minus
from streamhost.drawing import layout_of, svg
from streamhost.errors import DiagramError

FEW, MANY = range(8), range(8, 200)


def check_drawn(diagram: Diagram) -> None:
    text = svg(diagram)
    assert faults_of_figure(text, diagram) == []
    assert [label.symbol.id for label in layout_of(diagram).labels if label.hit] == []


@pytest.mark.parametrize("seed", FEW)
def test_random_diagrams_are_drawn_as_they_are(seed: int) -> None:
    check_drawn(random_diagram(Random(seed), 20, stable=False))


@pytest.mark.slow
@pytest.mark.parametrize("seed", MANY)
def test_many_random_diagrams_are_drawn_as_they_are(seed: int) -> None:
    check_drawn(random_diagram(Random(seed), 20, stable=False))


@pytest.mark.parametrize(
    "diagram",
    [
        examples.coupled(0.9, 0.3), examples.running_sum(64, 1 / 64), examples.direct_2([1.0, 2.0, 3.0], [1.0, 0.5, 0.2]),
        examples.fir([1.0, 2.0, 1.0], "even"), examples.all_pole_lattice([0.5, -0.2, 0.1]),
    ],
    ids=["coupled form", "running sum", "direct form", "tapped line", "lattice, two outputs"],
)
def test_diagrams_by_hand(diagram: Diagram) -> None:
    check_drawn(diagram)


def test_a_loop_hangs_from_a_straight_line() -> None:
    """One pole: input, adder and output in a row, the delay and its gain on the way back."""
    builder = Builder()
    x, held = builder.input(), builder.delay("held")
    y = builder.sum(x, builder.gain(held, "a", 0.5))
    held.takes(y)
    builder.output(y)
    text = svg(builder.build())
    rows = {kind: [(box.top + box.bottom) / 2 for box in page_of(text).boxes if box.kind == kind]
            for kind in ("input", "sum", "output", "delay", "gain")}  # fmt: skip
    assert rows["input"] == rows["sum"] == rows["output"]
    assert rows["delay"] == rows["gain"] != rows["sum"]
    assert crossings(page_of(text)) == 0


def test_a_source_read_twice_a_loose_delay_and_a_loop_on_itself() -> None:
    builder = Builder()
    x, own, loop = builder.input(), builder.delay("own"), builder.delay("loop")
    own.takes(own)
    y = builder.sum(x, x, minus(x), minus(loop), loop, own)
    loop.takes(y)
    builder.output(y)
    check_drawn(builder.build())


def test_no_input_at_all() -> None:
    builder = Builder()
    held = builder.delay("held")
    held.takes(builder.gain(held, "k", 0.5))
    builder.output(held)
    check_drawn(builder.build(check=False))


def two_gains() -> str:
    builder = Builder()
    x = builder.place(builder.input(), (0.0, 0.0))
    a = builder.place(builder.gain(x, "a"), (2.0, 0.0))
    b = builder.place(builder.gain(x, "b"), (2.0, 1.0))
    y = builder.place(builder.sum(a, minus(b)), (4.0, 0.0))
    builder.place(builder.output(y), (5.0, 0.0))
    return svg(builder.build())


def test_the_reader_misses_no_line_no_dot_and_no_minus() -> None:
    """One thing removed at a time: each must be seen."""
    whole = page_of(two_gains())
    wanted = edges_of(whole)
    assert sum(wanted.values()) == 5
    for kind in ("lines", "dots", "minuses"):
        assert getattr(whole, kind), f"the drawing has {kind}"
        for i in range(len(getattr(whole, kind))):
            page = page_of(two_gains())
            del getattr(page, kind)[i]
            assert faults_of_joints(page) or differs(page, wanted), f"{kind}[{i}] is not missed"


def differs(page: object, wanted: object) -> bool:
    try:
        return edges_of(page) != wanted  # type: ignore[arg-type]
    except AssertionError:
        return True


def test_the_reader_sees_a_gain_moved_and_a_foreign_wire() -> None:
    diagram = examples.coupled(0.9, 0.3)
    text = svg(diagram)
    assert edges_of(page_of(text)) == expected_edges(diagram, {})
    page = page_of(text)
    page.lines.append(((page.lines[0][0][0], -100.0), (page.lines[0][0][0], 1000.0)))
    assert faults_of_joints(page) or differs(page, expected_edges(diagram, {}))
    moved = page_of(text)
    gain = next(i for i, box in enumerate(moved.boxes) if box.kind == "gain")
    box = moved.boxes.pop(gain)
    moved.boxes.append(type(box)(box.id, box.kind, box.left, box.top + 8, box.right, box.bottom + 8,
                                 tuple((x, y + 8) for x, y in box.ports)))
    assert differs(moved, expected_edges(diagram, {}))


def test_places_without_room_are_refused() -> None:
    builder = Builder()
    x = builder.place(builder.input(), (0.0, 0.0))
    g = builder.place(builder.gain(x, "g"), (0.25, 0.0))
    builder.place(builder.output(g), (2.0, 0.0))
    with pytest.raises(DiagramError, match="Put them further apart"):
        svg(builder.build())


def test_places_make_room_for_marks() -> None:
    builder = Builder()
    x = builder.place(builder.input(), (0.0, 0.0))
    g = builder.place(builder.gain(x, "g"), (1.0, 0.0))
    d = builder.place(builder.delay("d", g), (1.625, 0.0))
    builder.place(builder.output(d), (2.5, 0.0))
    diagram = builder.build()
    plain, marked = svg(diagram), svg(diagram, rounded={g.index})
    assert faults_of_figure(plain, diagram) == faults_of_figure(marked, diagram) == []
    gaps = [boxes[2].left - boxes[1].right for boxes in (page_of(plain).boxes, page_of(marked).boxes)]
    assert gaps[0] < 4 + 13 + 8 <= gaps[1]  # the square, 4 px off its symbol and 13 px wide, and the arrow head


@pytest.mark.parametrize(
    ("at", "face", "message"), [((0.1, 0.0), "E", "multiples of 1/8"), ((0.0, 0.0), "up", "one of the sides")]
)
def test_a_place_that_cannot_be_is_refused(at: tuple[float, float], face: str, message: str) -> None:
    builder = Builder()
    with pytest.raises(DiagramError, match=message):
        builder.place(builder.input(), at, face)


def test_places_change_neither_the_hash_nor_what_is_computed() -> None:
    plain, placed = Builder(), Builder()
    plain.output(plain.input())
    x = placed.place(placed.input(), (0.0, 0.0))
    placed.place(placed.output(x), (2.0, 0.0))
    assert plain.build().hash == placed.build().hash
    assert plain.build().nodes == placed.build().nodes


def test_channels_that_differ_have_rows_of_their_own() -> None:
    builder = Builder()
    builder.output(builder.gain(builder.input(), "k", [0.25, 0.5]))
    text = svg(builder.build())
    assert ">channel<" in text
    assert ">0.250000<" in text
    assert ">0.500000<" in text


def test_a_name_from_outside_is_escaped() -> None:
    builder = Builder()
    builder.output(builder.gain(builder.input("<x>"), "a&b"), 'say "y"')
    text = svg(builder.build())
    assert "&lt;x&gt;" in text
    assert "a&amp;b" in text
    page_of(text)
