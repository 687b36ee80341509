"""Diagrams read back as their difference equations: one for each output, or one for each node."""

import re
from fractions import Fraction
from itertools import islice
from random import Random

import numpy as np
import pytest
from diagram_examples import all_pole_lattice, coupled, direct_1, fir, running_sum
from hypothesis import given
from random_diagrams import diagrams, random_diagram

from streamhost.diagram import Builder, Diagram, minus
from streamhost.diagram.difference import difference
from streamhost.diagram.exact import impulse_responses
from streamhost.diagram.linear import exact_transfer_function, transfer_function
from streamhost.diagram.polynomials import product
from streamhost.errors import DiagramError
from streamhost.filters import Filter

RECURSIVE = "# recursive: y[n] depends on its own past"


def echo(frames: int = 4800) -> Diagram:
    builder = Builder()
    x, past = builder.input(), builder.delay("past", n=frames)
    y = builder.sum(x, builder.gain(past, "g", 0.7))
    past.takes(y)
    builder.output(y)
    return builder.build()


def delay_network(size: int) -> Diagram:
    """Delays that all feed each other, by a matrix that keeps the power of what goes round."""
    builder = Builder()
    matrix = 0.9 * np.linalg.qr(np.random.default_rng(size).normal(size=(size, size)))[0]
    x, lines = builder.input(), [builder.delay(f"d{i}", n=20 + 7 * i) for i in range(size)]
    for i, line in enumerate(lines):
        line.takes(builder.sum(x, *(builder.gain(other, f"m{i}_{j}", matrix[i, j]) for j, other in enumerate(lines))))
    builder.output(builder.sum(*lines))
    return builder.build()


def test_a_direct_form_reads_x_by_age_then_y() -> None:
    diagram = direct_1([0.5, 0.0, -1.0], [1.0, -0.9, 0.0, 2.5e-9])
    assert diagram.equation() == f"y[n] = 0.5 x[n] - x[n-2] + 0.9 y[n-1] - 2.5e-09 y[n-3]\n{RECURSIVE}"


def test_a_running_sum_reads_as_the_recursion_that_it_is() -> None:
    assert running_sum(8).equation() == f"y[n] = x[n] - x[n-8] + y[n-1]\n{RECURSIVE}"
    assert running_sum(8).response_ends()


def test_a_zero_that_cancels_the_pole_is_kept() -> None:
    assert direct_1([1.0, 0.0, -0.25], [1.0, -0.5]).equation() == f"y[n] = x[n] - 0.25 x[n-2] + 0.5 y[n-1]\n{RECURSIVE}"


def test_a_long_echo_is_short() -> None:
    assert echo().equation() == f"y[n] = x[n] + 0.7 y[n-4800]\n{RECURSIVE}"


def test_without_recursion() -> None:
    assert fir([0.25, 0.5, 0.25], "even").equation() == "y[n] = 0.25 x[n] + 0.5 x[n-1] + 0.25 x[n-2]\n# not recursive"
    assert fir([0.0, -1.0]).equation() == "y[n] = -x[n-1]\n# not recursive"
    assert fir([0.0]).equation() == "y[n] = 0\n# not recursive"


def test_a_loop_through_a_coefficient_of_zero_is_no_recursion_of_the_equation() -> None:
    assert direct_1([1.0], [1.0, 0.0]).equation() == "y[n] = x[n]\n# not recursive, although the diagram has a loop"


def test_recursion_that_nothing_drives_is_kept() -> None:
    assert direct_1([0.0], [1.0, -0.5]).equation() == f"y[n] = 0.5 y[n-1]\n{RECURSIVE}"


def test_error_feedback_is_no_recursion_of_the_equation() -> None:
    builder = Builder()
    past = builder.delay("e1")
    y = builder.sum(builder.gain(builder.input(), "b", 0.5), past, label="y")
    past.takes(builder.residue(y))
    builder.output(y)
    assert builder.build().equation() == "y[n] = 0.5 x[n]\n# not recursive, although the diagram has a loop"


def test_the_coupled_form_by_hand() -> None:
    # 1 - 2 r cos(w) z^-1 + r^2 z^-2 over r sin(w) z^-1 (Oppenheim & Schafer, ch. 6, coupled form), with r cos(w) = 0.5
    # and r sin(w) = 0.25 exact in float64.
    diagram = coupled(1.0, 0.0).with_values(np.array([[0.5], [0.25], [0.25], [0.5]]))
    assert diagram.equation() == f"y[n] = 0.25 x[n-1] + y[n-1] - 0.3125 y[n-2]\n{RECURSIVE}"


def test_every_output_has_an_equation_named_by_it() -> None:
    diagram = all_pole_lattice([0.5, -0.25])
    assert diagram.equation() == (
        "y1[n] = -0.25 x[n] + 0.375 x[n-1] + x[n-2] - 0.375 y1[n-1] + 0.25 y1[n-2]\n"
        "# recursive: y1[n] depends on its own past\n"
        "y2[n] = x[n] - 0.375 y2[n-1] + 0.25 y2[n-2]\n"
        "# recursive: y2[n] depends on its own past"
    )  # one output is named all-pass, which is no name in an equation


def test_an_output_shows_its_own_recursion_only() -> None:
    builder = Builder()
    x = builder.input("in")
    for name, value in (("low", 0.5), ("high", 0.25)):
        past = builder.delay()
        y = builder.sum(x, builder.gain(past, "g", value))
        past.takes(y)
        builder.output(y, name)
    builder.output(x, "dry")
    assert builder.build().equation() == (
        "low[n] = x[n] + 0.5 low[n-1]\n# recursive: low[n] depends on its own past\n"
        "high[n] = x[n] + 0.25 high[n-1]\n# recursive: high[n] depends on its own past\n"
        "dry[n] = x[n]\n# not recursive, although the diagram has a loop"
    )


def test_several_inputs_have_their_labels() -> None:
    builder = Builder()
    left, right = builder.input("left"), builder.input("right")
    builder.output(builder.sum(left, minus(builder.delay("", right))))
    assert builder.build().equation() == "y[n] = left[n] - right[n-1]\n# not recursive"


def test_each_channel_has_its_own() -> None:
    builder = Builder()
    builder.output(builder.gain(builder.input(), "g", [0.5, 0.25]))
    diagram = builder.build()
    assert diagram.equation() == "y[n] = 0.5 x[n]\n# not recursive"
    assert diagram.equation(channel=1) == "y[n] = 0.25 x[n]\n# not recursive"


def test_digits() -> None:
    diagram = direct_1([1 / 3, 0.99996], [1.0, -2 / 3])
    assert diagram.equation(digits=4) == f"y[n] = 0.3333 x[n] + x[n-1] + 0.6667 y[n-1]\n{RECURSIVE}"
    assert diagram.equation(digits=1, nodes=True).splitlines()[3] == "b0[n] = 0.3 x[n]"


@pytest.mark.parametrize("digits", [0, 18, 2.0, True])
def test_digits_that_cannot_be(digits: object) -> None:
    with pytest.raises(DiagramError, match="1 to 17 significant digits"):
        direct_1([1.0], [1.0]).equation(digits=digits)  # type: ignore[arg-type]


def test_long_equations_are_wrapped_and_read_back() -> None:
    h = np.random.default_rng(3).normal(size=200)
    text = fir(h).equation()
    assert max(map(len, text.splitlines())) <= 100
    assert all(line.startswith("       ") for line in text.splitlines()[1:-1])
    assert Filter.from_equation(text, rate=1).whole()[0] == tuple(h)


def test_a_coefficient_beyond_float64_is_refused() -> None:
    builder = Builder()
    builder.output(builder.gain(builder.gain(builder.input(), "g", 1e200), "h", 1e200))
    with pytest.raises(DiagramError, match="larger than float64 holds"):
        builder.build().equation()


def test_loops_too_large_for_fractions_are_told() -> None:
    diagram = delay_network(12)
    text = diagram.equation()
    assert "# not exact" in text
    read, expected = Filter.from_equation(text, rate=1), transfer_function(diagram)
    # What is left out, and what text adds to it, is 1e-14 of the largest coefficient.
    for got, of in zip(read.whole(), (expected.numerators[0, 0], expected.denominator), strict=True):
        np.testing.assert_allclose(got, of[: len(got)], rtol=0, atol=1e-14 * abs(of).max())
        assert len(got) == np.flatnonzero(abs(of) >= 1e-14 * abs(of).max())[-1] + 1


def test_several_cuts_are_solved_exactly() -> None:
    diagram = delay_network(3)
    assert "# not exact" not in diagram.equation()
    agree(diagram)


def agree(diagram: Diagram, channel: int = 0) -> None:
    """numerator / denominator of each output is the exact transfer function, in fractions and without tolerance."""
    exact = exact_transfer_function(diagram, channel)
    for output, row in zip(diagram.outputs, exact.numerators, strict=True):
        found = difference(diagram, output, channel)
        assert found.denominator[0] == 1
        for mine, theirs in zip(found.numerators, row, strict=True):
            assert product(mine, exact.denominator) == product(theirs, found.denominator)


@given(diagrams(channels=2, step=2.0**-6))
def test_any_diagram_is_its_transfer_function(diagram: Diagram) -> None:
    agree(diagram, channel=1)


@pytest.mark.parametrize("seed", range(20))
def test_large_diagrams_are_their_transfer_functions(seed: int) -> None:
    agree(random_diagram(Random(seed), 60))


TERM = re.compile(r"([+-]?) ?(?:(\d[\d.]*(?:e[+-]?\d+)?) )?([\w-]+)\[n(?:-(\d+))?\]")


def evaluated(text: str, frames: int) -> dict[str, list[Fraction]]:
    """The lines of a node-by-node equation run as a program, in their order, on an impulse: the values of every name."""
    values: dict[str, list[Fraction]] = {}
    for now in range(frames):
        for line in text.splitlines():
            left, right = line.split("  #")[0].split(" = ", 1)
            name = left.removesuffix("[n]")
            if right == "input":
                value = Fraction(now == 0)
            elif right.startswith("what rounding dropped"):
                value = Fraction(0)
            else:
                value = Fraction(0)
                for sign, factor, source, age in TERM.findall(right.removeprefix("round(").removesuffix(")")):
                    frame = now - int(age or 0)
                    past = values[source][frame] if frame >= 0 else Fraction(0)
                    value += Fraction(f"{sign}1") * Fraction(factor or 1) * past
            values.setdefault(name, []).append(value)
    return values


@given(diagrams(step=2.0**-6))
def test_the_equations_of_the_nodes_are_a_program(diagram: Diagram) -> None:
    text = diagram.equation(nodes=True)
    assert len(text.splitlines()) == len(diagram.nodes)
    values = evaluated(text, 12)
    expected = list(islice(impulse_responses(diagram), 12))
    for i, output in enumerate(diagram.outputs):
        assert values[f'output "{diagram.nodes[output].label}"'] == [frame[i] for frame in expected]


def test_every_kind_of_node_has_its_line() -> None:
    builder = Builder()
    x, past = builder.input(), builder.delay("past", n=2)
    register = builder.round(builder.sum(x, minus(builder.gain(past, "a", -0.5)), builder.gain(x, "zero", 0.0), label="s"), "r")
    past.takes(register)
    line = builder.taps(builder.shift(register, -2, "quarter"), "h", [1.0, 0.5, -1.0], fold=None)
    builder.output(builder.sum(line, minus(builder.residue(register, "e")), label="out"))
    assert builder.build().equation(nodes=True).splitlines() == [
        "x[n] = input",
        "past[n] = r[n-2]  # recursive",
        "a[n] = -0.5 past[n]  # recursive",
        "zero[n] = 0 x[n]",
        "s[n] = x[n] - a[n] + zero[n]  # recursive",
        "r[n] = round(s[n])  # recursive",
        "quarter[n] = 0.25 r[n]",
        "h[n] = quarter[n] + 0.5 quarter[n-1] - quarter[n-2]",
        "e[n] = what rounding dropped from r[n]",
        "out[n] = h[n] - e[n]",
        'output "y" = out[n]',
    ]
