"""One pass in evaluation order that carries all unit vectors: nodes as rows over states, inputs and error sources."""

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from streamhost.diagram.diagram import Diagram
from streamhost.diagram.nodes import Delay, Gain, Input, Output, Residue, Round, Shift, Sum, Taps
from streamhost.errors import DiagramError

FloatArray = NDArray[np.float64]
Number = TypeVar("Number", float, int | Fraction)


@dataclass(frozen=True, eq=False)
class Rows:
    """The linear equations of one channel: next state = A x + B u + N e, node values = F x + G u + E e.

    x: the states, in order of nodes, a node's newest first; u: the inputs, in order of creation; e: the error of each
    source, added to the value of its node. F, G, E have a row for each node. `first_state[i]` is where the states of
    node i begin.
    """

    A: FloatArray
    B: FloatArray
    N: FloatArray
    F: FloatArray
    G: FloatArray
    E: FloatArray
    first_state: tuple[int, ...]


def propagate(diagram: Diagram, channel: int = 0, sources: Sequence[int] = ()) -> Rows:
    """The linear equations of one channel, with an error source at each of the nodes `sources`.

    A residue is minus the error of its register where that is a source, else 0, as in the ideal. Raises DiagramError
    for a channel that the coefficients do not have.
    """
    if not 0 <= channel < diagram.channels:
        raise DiagramError(f"Channel {channel} was asked for; the diagram has coefficients for {diagram.channels}, "
                           f"counted from 0.")
    first_state = _first_states(diagram)
    states, inputs = first_state[-1], len(diagram.inputs)
    columns = _Columns(
        state=first_state,
        input={node: states + i for i, node in enumerate(diagram.inputs)},
        source={node: states + inputs + i for i, node in enumerate(sources)},
    )
    values = np.zeros((len(diagram.nodes), states + inputs + len(sources)))
    coefficients = diagram.values[:, channel]
    for index in diagram.order:
        values[index] = _value(diagram, index, values, columns, coefficients)
        if index in columns.source:
            values[index, columns.source[index]] += 1.0
    following = _next_states(diagram, values, first_state)
    cuts = [states, states + inputs]
    A, B, N = np.split(following, cuts, axis=1)
    F, G, E = np.split(values, cuts, axis=1)
    return Rows(A, B, N, F, G, E, first_state[:-1])


def tap_weights(taps: Taps, coefficients: Sequence[Number], zero: Number) -> list[Number]:
    """The weight of each tap, unfolded; `coefficients` is indexed by slot."""
    half = [coefficients[slot] for slot in taps.coefficients]
    if taps.last_first:
        half.reverse()
    if taps.fold is None:
        return half + [zero] * (taps.length - len(half))
    middle = [half.pop()] if len(half) > taps.length // 2 else [zero] * (taps.length % 2)
    mirrored = half[::-1] if taps.fold == "even" else [-c for c in reversed(half)]
    return half + middle + mirrored


@dataclass(frozen=True)
class _Columns:
    """Which column of a row belongs to what."""

    state: tuple[int, ...]
    input: dict[int, int]
    source: dict[int, int]


def _first_states(diagram: Diagram) -> tuple[int, ...]:
    """The first state of each node, and behind the last one the number of states."""
    first = [0]
    for node in diagram.nodes:
        first.append(first[-1] + node.stores)
    return tuple(first)


def _value(diagram: Diagram, index: int, values: FloatArray, columns: _Columns, coefficients: FloatArray) -> FloatArray:
    """The row of a node, from the rows of the nodes it reads, without its own error."""
    row = np.zeros(values.shape[1])
    match diagram.nodes[index]:
        case Input():
            row[columns.input[index]] = 1.0
        case Output(source=source) | Round(source=source):
            row += values[source]
        case Delay(n=n):
            row[columns.state[index] + n - 1] = 1.0
        case Gain(source=source, coefficient=slot):
            row += coefficients[slot] * values[source]
        case Shift(source=source, k=k):
            row += 2.0**k * values[source]
        case Sum(terms=terms):
            for term in terms:
                row += term.sign * values[term.source]
        case Taps(source=source) as taps:
            first, *others = tap_weights(taps, list(coefficients), 0.0)
            row += first * values[source]
            start = columns.state[index]
            row[start:start + taps.stores] += others
        case Residue(source=source):
            if source in columns.source:
                row[columns.source[source]] = -1.0
        case node:
            raise AssertionError(f"no linear equation for a {node.kind}")
    return row


def _next_states(diagram: Diagram, values: FloatArray, first_state: tuple[int, ...]) -> FloatArray:
    following = np.zeros((first_state[-1], values.shape[1]))
    for index, node in enumerate(diagram.nodes):
        if isinstance(node, Delay | Taps) and node.stores:
            start = first_state[index]
            following[start] = values[node.source]
            older = np.arange(start + 1, start + node.stores)
            following[older, older - 1] = 1.0
    return following
