"""The rules of signal-flow graphs, each broken in one way, with the message that names the node."""

from collections.abc import Callable
from dataclasses import replace
from itertools import pairwise

import pytest

from streamhost.diagram import Builder, Diagram, Gain, Output, Sum, Term, minus
from streamhost.diagram.legality import check_diagram
from streamhost.errors import DiagramError


def no_input() -> Diagram:
    b = Builder()
    d = b.delay("d")
    d.takes(d)
    b.output(d)
    return b.build()


def no_output() -> Diagram:
    b = Builder()
    b.input()
    return b.build()


def undriven() -> Diagram:
    b = Builder()
    b.output(b.sum(b.input(), b.delay("left"), b.delay("right")))
    return b.build()


def delay_of_no_frames() -> Diagram:
    b = Builder()
    b.output(b.delay("d", b.input(), 0))
    return b.build()


def empty_sum() -> Diagram:
    b = Builder()
    b.output(b.sum(b.input(), b.sum(label="nothing")))
    return b.build()


def long_mark() -> Diagram:
    b = Builder()
    b.output(b.sum(b.input(), label="s", grow=49))
    return b.build()


def long_shift() -> Diagram:
    b = Builder()
    b.output(b.shift(b.input(), -64, "s"))
    return b.build()


def no_taps() -> Diagram:
    b = Builder()
    b.output(b.taps(b.input(), "h", []))
    return b.build()


def output_read() -> Diagram:
    b = Builder()
    b.output(b.gain(b.output(b.input(), "first"), "g", 1.0), "second")
    return b.build()


def residue_of_a_delay() -> Diagram:
    b = Builder()
    b.output(b.residue(b.delay("d", b.input())))
    return b.build()


def loose_ends() -> Diagram:
    b = Builder()
    x = b.input()
    b.output(x)
    d = b.delay("d")
    d.takes(b.gain(d, "g", 0.5))
    return b.build()


BROKEN: list[tuple[Callable[[], Diagram], str]] = [
    (no_input, "The diagram has no input."),
    (no_output, "The diagram has no output."),
    (undriven, 'The diagram has a delay "left" that nothing drives; it has a delay "right" that nothing drives.'),
    (delay_of_no_frames, 'The diagram has a delay "d" of 0 frames; a delay is 1 or more.'),
    (empty_sum, 'The diagram has a sum "nothing" without a term.'),
    (long_mark, 'The diagram has a sum "s" marked grow = 49; 0 to 48 bits are possible.'),
    (long_shift, 'The diagram has a shift "s" by -64; at most 63 either way.'),
    (no_taps, 'The diagram has taps "h" without a coefficient.'),
    (output_read, 'The diagram reads its output "first" in "g".'),
    (residue_of_a_delay, 'The diagram asks for the residue of "d", a delay, which is never rounded.'),
    (loose_ends, 'The diagram has a delay "d" that reaches no output; it has a gain "g" that reaches no output.'),
]


@pytest.mark.parametrize(("broken", "message"), BROKEN, ids=[broken.__name__ for broken, _ in BROKEN])
def test_broken_rule_names_the_node(broken: Callable[[], Diagram], message: str) -> None:
    with pytest.raises(DiagramError) as error:
        broken()
    assert str(error.value) == message


def test_an_input_that_nobody_reads_is_legal() -> None:
    b = Builder()
    b.output(b.input())
    b.input("unused")
    assert len(b.build().inputs) == 2


def with_loop(*reads: tuple[str, str]) -> Diagram:
    """Input and output around sums named a, b, c, ... that also read each other: (reader, read)."""
    builder = Builder()
    x = builder.input()
    names = sorted({name for pair in reads for name in pair})
    sums = {name: builder.sum(x, label=name) for name in names}
    builder.output(builder.sum(*sums.values(), label="all"))
    diagram = builder.build()
    nodes = list(diagram.nodes)
    for reader, read in reads:
        index = sums[reader].index
        node = nodes[index]
        assert isinstance(node, Sum)
        nodes[index] = replace(node, terms=(*node.terms, Term(1, sums[read].index)))
    return replace(diagram, nodes=tuple(nodes))


@pytest.mark.parametrize(("reads", "path"), [
    ([("a", "a")], "a -> a"),
    ([("a", "b"), ("b", "a")], "b -> a -> b"),
    ([("a", "c"), ("b", "a"), ("c", "b")], "b -> c -> a -> b"),
    ([("a", "b"), ("b", "c"), ("c", "b")], "c -> b -> c"),
])
def test_loop_without_a_delay_is_refused_with_the_path_that_closes_it(reads: list[tuple[str, str]], path: str) -> None:
    with pytest.raises(DiagramError) as error:
        check_diagram(with_loop(*reads))
    assert str(error.value) == f"The diagram has a loop without a delay: {path}."


def test_the_path_of_a_loop_runs_in_the_direction_of_flow() -> None:
    # c reads a, b reads c, a reads b: the signal flows a -> c -> b -> a.
    diagram = with_loop(("c", "a"), ("b", "c"), ("a", "b"))
    with pytest.raises(DiagramError) as error:
        check_diagram(diagram)
    path = str(error.value).removeprefix("The diagram has a loop without a delay: ").removesuffix(".").split(" -> ")
    flows = {(diagram.nodes[source].label, node.label) for node in diagram.nodes for source in node.reads}
    assert path[0] == path[-1]
    assert set(pairwise(path)) <= flows


def test_residue_needs_its_register_now_so_that_error_feedback_without_a_delay_is_a_loop() -> None:
    b = Builder()
    x = b.input()
    y = b.sum(x, label="y")
    b.output(y)
    e = b.residue(y, "e")
    b.output(b.gain(e, "c", 1.0), "z")
    diagram = b.build()
    fed_back = replace(diagram, nodes=(diagram.nodes[0], Sum("y", (Term(1, 0), Term(-1, 4))), *diagram.nodes[2:]))
    assert isinstance(diagram.nodes[2], Output)
    assert isinstance(diagram.nodes[4], Gain)
    with pytest.raises(DiagramError, match=r"has a loop without a delay: e -> c -> y -> e\."):
        check_diagram(fed_back)


def test_loops_with_a_delay_are_legal() -> None:
    b = Builder()
    x, d = b.input(), b.delay("d")
    y = b.sum(x, minus(d))
    d.takes(y)
    b.output(y)
    check_diagram(b.build(check=False))
