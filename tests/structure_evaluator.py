"""A diagram run and written out in the plainest way, for the tests of structures."""

from collections.abc import Iterable
from fractions import Fraction
from typing import TypeVar

from streamhost.diagram import Delay, Diagram, Gain, Input, Output, Round, Shift, Sum

Number = TypeVar("Number", float, Fraction)


def run(diagram: Diagram, signal: Iterable[Number], kind: type[Number]) -> list[dict[str, Number]]:
    """The value of each node by its label, frame by frame, in `kind` arithmetic: float or Fraction.

    A sum is added left to right, a register rounds nothing. The output's value is under "output".
    """
    coefficients = [kind(value) for value in diagram.values[:, 0].tolist()]
    state: dict[int, Number] = {}
    frames = []
    for x in signal:
        now: dict[int, Number] = {}
        for index in diagram.order:
            now[index] = _value(diagram, index, now, state, coefficients, x, kind)
        state = {i: now[node.source] for i, node in enumerate(diagram.nodes) if isinstance(node, Delay)}
        named = {node.label: now[i] for i, node in enumerate(diagram.nodes) if not isinstance(node, Output)}
        frames.append(named | {"output": now[diagram.outputs[0]]})
    return frames


def _value(
    diagram: Diagram, index: int, now: dict[int, Number], state: dict[int, Number], coefficients: list[Number],
    x: Number, kind: type[Number],
) -> Number:
    node = diagram.nodes[index]
    match node:
        case Input():
            return x
        case Delay():
            assert node.n == 1
            return state.get(index, kind(0))
        case Gain():
            return coefficients[node.coefficient] * now[node.source]
        case Shift():
            return now[node.source] * kind(2) ** node.k
        case Sum():
            first, *others = node.terms
            total = now[first.source] if first.sign > 0 else -now[first.source]
            for term in others:
                total = total + now[term.source] if term.sign > 0 else total - now[term.source]
            return total
        case Output() | Round():
            return now[node.source]
    raise AssertionError(f"these forms have no {node.kind}")


def response(diagram: Diagram, frames: int, kind: type[Number]) -> list[Number]:
    """The impulse response at the output."""
    impulse = [kind(n == 0) for n in range(frames)]
    return [frame["output"] for frame in run(diagram, impulse, kind)]


def series(b: Iterable[float], a: Iterable[float], frames: int) -> list[Fraction]:
    """The impulse response of B / A by long division of the exact polynomials, a[0] = 1."""
    numerator, denominator = [Fraction(v) for v in b], [Fraction(v) for v in a]
    h: list[Fraction] = []
    for n in range(frames):
        fed_back = sum((denominator[k] * h[n - k] for k in range(1, min(n + 1, len(denominator)))), Fraction(0))
        h.append((numerator[n] if n < len(numerator) else Fraction(0)) - fed_back)
    return h


def written(diagram: Diagram) -> list[str]:
    """The nodes in the order of their creation, one line each; z(...) is a delay, [...] a register."""
    label = [node.label for node in diagram.nodes]
    lines = []
    for node in diagram.nodes:
        match node:
            case Input():
                lines.append(f"input {node.label}")
            case Delay():
                lines.append(f"{node.label} = z({label[node.source]})")
            case Gain():
                lines.append(f"{node.label} = {diagram.slots[node.coefficient].label} * {label[node.source]}")
            case Sum():
                terms = "".join(f" {'+' if term.sign > 0 else '-'} {label[term.source]}" for term in node.terms)
                lines.append(f"{node.label} =" + terms.removeprefix(" +"))
            case Round():
                lines.append(f"{node.label} = [{label[node.source]}]")
            case Output():
                lines.append(f"output {node.label} = {label[node.source]}")
            case _:
                raise AssertionError(f"these forms have no {node.kind}")
    return lines
