"""What stands beside and below a drawing: values, the equation, what is recursive."""

import pytest
from diagram_examples import fir, running_sum
from drawing_reader import faults_of, page_of
from drawn_forms import cascade, whole
from form_filters import DIRECT

from streamhost.diagram import Builder, Diagram
from streamhost.diagram.questions import response_frames
from streamhost.drawing import nature, svg
from streamhost.errors import DiagramError

MINUS = "\N{MINUS SIGN}"


def comb_of_channels() -> Diagram:
    builder = Builder()
    builder.output(builder.gain(builder.input(), "k", [0.25, 0.5]))
    return builder.build()


@pytest.mark.parametrize("name", DIRECT)
@pytest.mark.parametrize("sections", [1, 2, 4])
def test_values_find_room_beside_the_gains_of_every_form(name: str, sections: int) -> None:
    diagram = cascade(name, sections)
    text = svg(diagram, values="beside")
    assert faults_of(text, diagram) == []
    assert page_of(text).scale >= 0.8
    assert 'data-part="values"' not in text
    for value in diagram.values[:, 0]:
        assert f">{value:.5g}<".replace("-", MINUS) in text


def test_values_beside_a_line_in_rows_push_its_columns_apart() -> None:
    diagram = whole("direct-1", 19, 0)
    text = svg(diagram, values="beside")
    assert faults_of(text, diagram) == []
    assert 'data-part="values"' not in text


def test_values_without_room_are_in_a_table() -> None:
    for diagram in (cascade("direct-1", 9), comb_of_channels()):  # one section for all; two values for one gain
        assert svg(diagram, values="beside") == svg(diagram)
    tiny = Builder()
    tiny.output(tiny.gain(tiny.input(), "k", -1.2345e-30))  # no three digits in eight characters
    assert 'data-part="values"' in svg(tiny.build(), values="beside")


def test_no_values_at_all() -> None:
    text = svg(whole("direct-1", 2, 2), values="none")
    assert 'data-part="values"' not in text
    assert "<tspan font-style=\"italic\">y</tspan>[<tspan font-style=\"italic\">n</tspan>] =" not in text


def test_other_places_for_values_are_refused() -> None:
    with pytest.raises(DiagramError, match='values = "below" is not known: table, beside, none'):
        svg(whole("direct-1", 2, 2), values="below")


def test_the_equation_is_written_where_it_fits() -> None:
    builder = Builder()
    x, d = builder.input(), builder.delay("d")
    y = builder.sum(builder.gain(x, "b", 0.1), builder.gain(d, "a", 0.9))
    d.takes(y)
    builder.output(y)
    n = '<tspan font-style="italic">n</tspan>'
    y_, x_ = (f'<tspan font-style="italic">{name}</tspan>' for name in "yx")
    assert f">{y_}[{n}] = 0.1 {x_}[{n}] + 0.9 {y_}[{n}{MINUS}1]<" in svg(builder.build())
    assert "] = " not in svg(cascade("direct-1", 4))


@pytest.mark.parametrize(
    ("diagram", "frames", "sentence"),
    [
        (whole("direct-1", 2, 2), None, "Recursive; the impulse response does not end."),
        (whole("transposed-2", 19, 0), 20, "Not recursive; the impulse response ends after 20 frames."),
        (whole("direct-2", 0, 0), 1, "Not recursive; the impulse response ends after 1 frame."),
        (fir([1.0, 2.0, 1.0], "even"), 3, "Not recursive; the impulse response ends after 3 frames."),
        (running_sum(64, 1 / 64), 64, "Recursive, and yet the impulse response ends after 64 frames."),
        (running_sum(1000, 0.001), 1000, "Recursive."),
    ],
    ids=["biquad", "20 taps", "a gain", "folded", "running sum", "long running sum"],
)
def test_what_is_recursive_and_what_ends(diagram: Diagram, frames: int | None, sentence: str) -> None:
    assert response_frames(diagram) == frames
    assert nature(diagram) == sentence
    recursive = diagram.has_loop()
    assert bool(page_of(svg(diagram)).heavy) == recursive
    words = sentence.replace("Recursive", "Recursive along the heavy lines")
    assert f">{words if recursive else sentence}<" in svg(diagram)


def test_a_response_of_zeros_has_no_frame() -> None:
    builder = Builder()
    builder.output(builder.gain(builder.input(), "k", 0.0))
    assert response_frames(builder.build()) == 0


@pytest.mark.parametrize("orders", [(5, 2), (2, 5), (3, 0)], ids=str)
@pytest.mark.parametrize("name", DIRECT)
def test_only_what_is_fed_back_is_heavy(name: str, orders: tuple[int, int]) -> None:
    """Also where the numerator is longer than the recursion: then a part of one sum is in the loop and a part is not."""
    diagram = whole(name, *orders)
    page = page_of(svg(diagram))
    assert bool(page.heavy) == (orders[1] > 0)
    assert len(page.heavy) < len(page.lines)
