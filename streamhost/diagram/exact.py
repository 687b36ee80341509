"""A diagram run on numbers that are not rounded: its coefficients are binary fractions, and are taken as they are."""

from collections import deque
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from fractions import Fraction
from itertools import chain

from streamhost.diagram.diagram import Diagram
from streamhost.diagram.nodes import Delay, Gain, Input, Output, Residue, Round, Shift, Sum, Taps
from streamhost.diagram.rows import tap_weights

Exact = int | Fraction
PRIME = 2**61 - 1


@dataclass(frozen=True)
class Numbers:
    """Where a diagram is evaluated: how a coefficient is read, and what is done to every value."""

    read: Callable[[Fraction], Exact]
    settle: Callable[[Exact], Exact]


def _shortest(value: Fraction) -> Exact:
    return value.numerator if value.denominator == 1 else value


RATIONALS = Numbers(read=_shortest, settle=lambda value: value)
"""Exact; the numbers grow with every frame of a recursive diagram."""

RESIDUES = Numbers(read=lambda value: value.numerator * pow(value.denominator, -1, PRIME) % PRIME,
                   settle=lambda value: value % PRIME)
"""Modulo a prime, in which 1/2 exists: fast whatever the size, and what is not 0 here is not 0."""


def impulse_responses(diagram: Diagram, channel: int = 0, input_: int = 0,
                      numbers: Numbers = RATIONALS) -> Iterator[list[Exact]]:
    """Frame by frame, without end, what an impulse at one input gives at each output; nothing is rounded."""
    run = _Run(diagram, channel, numbers)
    now: list[Exact] = [0] * len(diagram.nodes)
    now[diagram.inputs[input_]] = 1
    while True:
        for index in diagram.order:
            now[index] = numbers.settle(_value(run, index, now))
        yield [now[output] for output in diagram.outputs]
        for index, line in run.lines.items():
            line.appendleft(now[diagram.nodes[index].reads[0]])
        now[diagram.inputs[input_]] = 0


class _Run:
    """What the evaluation looks up for each node: its factor, the weights of its taps, its delay line, newest first."""

    def __init__(self, diagram: Diagram, channel: int, numbers: Numbers) -> None:
        self.nodes = diagram.nodes
        coefficients = [numbers.read(Fraction(float(c))) for c in diagram.values[:, channel]]
        self.factors: dict[int, Exact] = {}
        self.weights: dict[int, list[Exact]] = {}
        self.lines: dict[int, deque[Exact]] = {}
        for index, node in enumerate(diagram.nodes):
            match node:
                case Gain(coefficient=slot):
                    self.factors[index] = coefficients[slot]
                case Shift(k=k):
                    self.factors[index] = numbers.read(Fraction(2) ** k)
                case Taps() as taps:
                    self.weights[index] = tap_weights(taps, coefficients, 0)
            if isinstance(node, Delay | Taps):
                self.lines[index] = deque([0] * node.stores, maxlen=node.stores)


def _value(run: _Run, index: int, now: list[Exact]) -> Exact:
    match run.nodes[index]:
        case Input():
            return now[index]
        case Output(source=source) | Round(source=source):
            return now[source]
        case Gain(source=source) | Shift(source=source):
            return run.factors[index] * now[source]
        case Sum(terms=terms):
            return sum(term.sign * now[term.source] for term in terms)
        case Delay():
            return run.lines[index][-1]
        case Taps(source=source):
            line = chain((now[source],), run.lines[index])
            return sum(w * v for w, v in zip(run.weights[index], line, strict=True) if v)
        case Residue():
            return 0
        case node:
            raise AssertionError(f"no equation for a {node.kind}")
