"""What each kind of node answers, and what structures cost."""

import numpy as np
import pytest
from diagram_examples import all_pole_lattice, coupled, direct_1, direct_2, fir, running_sum, transposed_2

from streamhost.diagram import (
    Builder,
    Counts,
    Delay,
    Diagram,
    Gain,
    Input,
    Node,
    Output,
    Residue,
    Round,
    Shift,
    Sum,
    Taps,
    Term,
    minus,
)


@pytest.mark.parametrize(("node", "reads", "needs_now", "stores", "multiplications", "additions"), [
    (Input("x"), (), (), 0, 0, 0),
    (Output("y", 3), (3,), (3,), 0, 0, 0),
    (Delay("d", 3), (3,), (), 1, 0, 0),
    (Delay("d", 3, 5), (3,), (), 5, 0, 0),
    (Gain("g", 3, 0), (3,), (3,), 0, 1, 0),
    (Shift("s", 3, -2), (3,), (3,), 0, 0, 0),
    (Sum("s", (Term(1, 3), Term(-1, 4), Term(1, 3))), (3, 4, 3), (3, 4, 3), 0, 0, 2),
    (Sum("s", (Term(1, 3),), grow=4), (3,), (3,), 0, 0, 0),
    (Taps("t", 3, (0, 1, 2, 3), 4), (3,), (3,), 3, 4, 3),
    (Taps("t", 3, (0, 1), 4, "even"), (3,), (3,), 3, 2, 3),
    (Taps("t", 3, (0, 1, 2), 5, "even"), (3,), (3,), 4, 3, 4),
    (Taps("t", 3, (0, 1), 5, "odd"), (3,), (3,), 4, 2, 4),
    (Round("r", 3), (3,), (3,), 0, 0, 0),
    (Residue("e", 3), (3,), (3,), 0, 0, 0),
], ids=lambda value: repr(value) if isinstance(value, Node) else "")
def test_node_says_what_it_reads_stores_and_costs(
    node: Node, reads: tuple[int, ...], needs_now: tuple[int, ...], stores: int, multiplications: int, additions: int,
) -> None:
    assert node.reads == reads
    assert node.needs_now == needs_now
    assert (node.stores, node.multiplications, node.additions) == (stores, multiplications, additions)


def general_state_space() -> Diagram:
    builder = Builder()
    x, s = builder.input(), [builder.delay("s1"), builder.delay("s2")]
    for i, delay in enumerate(s):
        delay.takes(builder.sum(*(builder.gain(ref, f"a{i}", 0.1) for ref in s), builder.gain(x, f"b{i}", 1.0)))
    builder.output(builder.sum(*(builder.gain(ref, "c", 1.0) for ref in s), builder.gain(x, "d", 1.0)))
    return builder.build()


# Textbook counts (Oppenheim & Schafer ch. 6; Mitra), from memory, a0 = 1: multiplications, additions, states.
# The coupled core is counted with the sum at its input, 2 + 1 additions.
@pytest.mark.parametrize(("diagram", "counts"), [
    (direct_1([1, 2, 3], [1, 0.1, 0.2]), (5, 4, 4)),
    (direct_2([1, 2, 3], [1, 0.1, 0.2]), (5, 4, 2)),
    (transposed_2([1, 2, 3], [1, 0.1, 0.2]), (5, 4, 2)),
    (direct_2(np.ones(8).tolist(), [1.0, *np.zeros(7)]), (15, 14, 7)),
    (fir(np.arange(1.0, 12.0)), (11, 10, 10)),
    (fir([1, 2, 3, 3, 2, 1], "even"), (3, 5, 5)),
    (running_sum(16), (0, 2, 17)),
    (general_state_space(), (9, 6, 2)),
    (coupled(0.9, 0.5), (4, 3, 2)),
    (all_pole_lattice([0.1, 0.2, 0.3, 0.4]), (8, 8, 4)),
], ids=["direct-1", "direct-2", "transposed-2", "direct-2 of order 7", "FIR", "folded FIR", "running sum",
        "general state space", "coupled", "lattice"])
def test_counts_are_those_of_the_textbooks(diagram: Diagram, counts: tuple[int, int, int]) -> None:
    assert diagram.counts() == Counts(*counts)


def test_every_gain_is_a_multiplication_whatever_its_value() -> None:
    builder = Builder()
    x = builder.input()
    builder.output(builder.sum(*(builder.gain(x, "g", value) for value in (0.0, 1.0, -1.0, 0.5))))
    assert builder.build().counts() == Counts(4, 3, 0)


def test_readers_lists_each_reader_once_in_order() -> None:
    builder = Builder()
    x = builder.input()
    twice = builder.sum(x, minus(x), builder.gain(x, "g", 2.0), label="twice")
    builder.output(twice)
    assert builder.build().readers == ((1, 2), (2,), (3,), ())
