"""Evaluation order: every node after what it needs now, the first created of the ready ones, whatever the size."""

from hypothesis import given
from random_diagrams import diagrams

from streamhost.diagram import Builder, Diagram, Ref, minus
from streamhost.diagram.norms import responses_from_input


@given(diagrams())
def test_order_is_the_first_legal_one_by_creation(diagram: Diagram) -> None:
    assert sorted(diagram.order) == list(range(len(diagram.nodes)))
    done: set[int] = set()
    for index in diagram.order:
        ready = [i for i, n in enumerate(diagram.nodes) if i not in done and done.issuperset(n.needs_now)]
        assert index == min(ready)
        done.add(index)


def reversed_chain(length: int) -> Diagram:
    """x -> delay -> gain -> delay -> ..., the delays made first, each gain before what it reads is driven."""
    b = Builder()
    delays = [b.delay(f"d{i}") for i in range(length)]
    gains = [b.gain(delays[i], f"g{i}", 1.0) for i in reversed(range(length))][::-1]
    x = b.input()
    for i in reversed(range(length)):
        delays[i].takes(gains[i - 1] if i else x)
    b.output(gains[-1])
    return b.build()


def test_five_thousand_nodes_in_reverse_order_of_creation() -> None:
    diagram = reversed_chain(2500)
    assert len(diagram.nodes) == 5002
    assert len(diagram.order) == 5002
    assert not diagram.has_loop()
    assert diagram.response_ends()


def test_five_thousand_sums_in_one_frame() -> None:
    b = Builder()
    ref = x = b.input()
    for _ in range(5000):
        ref = b.sum(ref, x)
    b.output(ref)
    diagram = b.build()
    assert diagram.order == tuple(range(5002))
    assert responses_from_input(diagram, nodes=diagram.outputs, frames=2)[:, 0].tolist() == [5001.0, 0.0]


def impulse(diagram: Diagram, frames: int) -> list[float]:
    return responses_from_input(diagram, nodes=diagram.outputs, frames=frames)[:, 0].tolist()


def test_two_loops_that_share_a_delay() -> None:
    b = Builder()
    x, shared, own = b.input(), b.delay("shared"), b.delay("own")
    y = b.sum(x, b.gain(shared, "short", 0.5), b.gain(own, "long", 0.25), label="y")
    shared.takes(y)
    own.takes(shared)
    b.output(y)
    diagram = b.build()
    assert diagram.has_loop()
    expected = [1.0, 0.5]
    for _ in range(8):
        expected.append(0.5 * expected[-1] + 0.25 * expected[-2])
    assert impulse(diagram, 10) == expected


def delays_in_a_row(count: int, backwards: bool) -> Diagram:
    b = Builder()
    x = b.input()
    refs: list[Ref] = [b.delay(f"d{i}") for i in range(count)]
    if backwards:
        refs.reverse()
    for delay, source in zip(refs, [x, *refs], strict=False):
        delay.takes(source)
    b.output(refs[-1])
    return b.build()


def test_delays_that_feed_delays_each_take_a_frame_in_either_order() -> None:
    for count in (1, 2, 3):
        expected = [float(n == count) for n in range(6)]
        assert impulse(delays_in_a_row(count, backwards=False), 6) == expected
        assert impulse(delays_in_a_row(count, backwards=True), 6) == expected


def test_two_delays_that_swap_hold_their_values_for_a_frame() -> None:
    b = Builder()
    x, left, right = b.input(), b.delay("left"), b.delay("right")
    left.takes(b.sum(right, x))
    right.takes(left)
    b.output(b.sum(left, minus(right), label="difference"))
    assert impulse(b.build(), 7) == [0.0, 1.0, -1.0, 1.0, -1.0, 1.0, -1.0]


def test_a_delay_of_n_frames_is_n_delays() -> None:
    b = Builder()
    b.output(b.delay("d", b.input(), 4))
    assert impulse(b.build(), 7) == [0.0, 0.0, 0.0, 0.0, 1.0, 0.0, 0.0]
    assert impulse(delays_in_a_row(4, backwards=False), 7) == impulse(b.build(), 7)
