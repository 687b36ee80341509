"""A diagram run in the plainest way: node by node, frame by frame, with errors added where they are wanted."""

from collections import deque
from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

from streamhost.diagram import Delay, Diagram, Gain, Input, Residue, Shift, Sum, Taps

FloatArray = NDArray[np.float64]


def evaluate(diagram: Diagram, x: FloatArray, channel: int = 0,
             errors: Mapping[int, FloatArray] | None = None) -> FloatArray:
    """The value of every node, (frames, nodes), for one input x (frames,); `errors` are added to nodes' values."""
    errors = errors or {}
    lines = {i: deque([0.0] * n.stores, maxlen=n.stores) for i, n in enumerate(diagram.nodes) if n.stores}
    coefficients = diagram.values[:, channel].tolist()
    values = np.zeros((len(x), len(diagram.nodes)))
    for frame, now in enumerate(values):
        for index in diagram.order:
            now[index] = _value(diagram, index, now, lines.get(index, deque()), coefficients, x[frame])
            if index in errors:
                now[index] += errors[index][frame]
            node = diagram.nodes[index]
            if isinstance(node, Residue) and node.source in errors:
                now[index] -= errors[node.source][frame]
        for index, line in lines.items():
            line.appendleft(now[diagram.nodes[index].reads[0]])
    return values


def _value(diagram: Diagram, index: int, now: FloatArray, line: deque[float], c: list[float], x: float) -> float:
    node = diagram.nodes[index]
    match node:
        case Input():
            return x
        case Delay():
            return line[-1]
        case Gain():
            return c[node.coefficient] * float(now[node.source])
        case Shift():
            return 2.0**node.k * float(now[node.source])
        case Sum():
            return sum(term.sign * float(now[term.source]) for term in node.terms)
        case Taps():
            return _weighted_sum(node, [float(now[node.source]), *line], [c[slot] for slot in node.coefficients])
        case Residue():
            return 0.0
    return float(now[node.reads[0]])


def _weighted_sum(node: Taps, line: list[float], c: list[float]) -> float:
    if node.fold is None:
        return sum(w * v for w, v in zip(c[::-1] if node.last_first else c, line, strict=True))
    sign = 1.0 if node.fold == "even" else -1.0
    total = sum(w * (v + sign * u) for w, v, u in zip(c, line[: len(line) // 2], line[::-1], strict=False))
    return total + (c[-1] * line[len(line) // 2] if len(line) % 2 and node.fold == "even" else 0.0)
