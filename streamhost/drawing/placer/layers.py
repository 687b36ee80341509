"""The column of every symbol: the least total length of wires, every step at least one column to the right."""

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from streamhost.drawing.placer.chains import chains_of, ordered_hubs
from streamhost.drawing.sheet import Sheet

Edge = tuple[int, int]


@dataclass(frozen=True)
class Layered:
    """Vertices with their layers; the first ones are the symbols, the others bend points of wires.

    `edges` join vertices of neighbouring layers. `turned` are the symbols that face west; `loose` the edges at both ends
    of what runs backwards, whose wires turn there anyway.
    """

    layer: tuple[int, ...]
    edges: tuple[Edge, ...]
    turned: frozenset[int]
    loose: frozenset[Edge]
    symbols: int


def layered(sheet: Sheet) -> Layered:
    """The sheet's symbols in layers, long wires cut into steps."""
    chains = chains_of(sheet)
    rank = {hub: i for i, hub in enumerate(ordered_hubs(chains))}
    edges: list[Edge] = []
    turned: set[int] = set()
    loose: set[Edge] = set()
    vertices = len(sheet.symbols)
    for chain in chains:
        if rank[chain.source] < rank[chain.sink]:
            edges += steps((chain.source, *chain.symbols, chain.sink))
        elif chain.symbols:
            # Back to its target it hangs between the target and a bend point right of its source.
            turned.update(chain.symbols)
            edges += steps((chain.sink, *reversed(chain.symbols), vertices))
            edges.append((chain.source, vertices))
            loose |= {(chain.source, vertices), (chain.sink, chain.symbols[-1])}
            vertices += 1
    layer = shortest(sheet, vertices, edges)
    return with_steps(len(sheet.symbols), layer, edges, turned, loose)


def steps(path: Sequence[int]) -> list[Edge]:
    return list(pairwise(path))


def shortest(sheet: Sheet, vertices: int, edges: Sequence[Edge]) -> list[int]:
    """Layers of least total length; inputs in the first, outputs in the last."""
    first, last = vertices, vertices + 1
    inputs = [i for i, symbol in enumerate(sheet.symbols) if symbol.kind == "input"]
    outputs = [i for i, symbol in enumerate(sheet.symbols) if symbol.kind == "output"]
    least = [(a, b, 1) for a, b in edges]
    least += [(first, v, 0) for v in range(vertices)] + [(v, last, 0) for v in range(vertices)]
    least += [(v, first, 0) for v in inputs] + [(last, v, 0) for v in outputs]
    weights = np.zeros(vertices + 2)
    for a, b in edges:
        weights[b] += 1
        weights[a] -= 1
    weights[first] -= 0.01
    weights[last] += 0.01
    found = integers(weights, least)
    return [found[v] - found[first] for v in range(vertices)]


def integers(weights: "np.typing.NDArray[np.float64]", least: Sequence[tuple[int, int, int]]) -> list[int]:
    """Whole numbers v of least weights @ v with v[b] - v[a] >= d for each (a, b, d).

    Such a system has whole corners, so that the linear program's solution is whole.
    """
    from scipy.optimize import linprog
    from scipy.sparse import coo_array

    rows = np.repeat(np.arange(len(least)), 2)
    columns = np.array([v for a, b, _ in least for v in (a, b)])
    matrix = coo_array((np.tile([1.0, -1.0], len(least)), (rows, columns)), shape=(len(least), len(weights))).tocsr()
    result = linprog(weights, A_ub=matrix, b_ub=[-d for _, _, d in least], bounds=(0, None), method="highs-ds")
    assert result.status == 0, f"the layers of a graph without loops can be found: {result.message}"
    return [round(value) for value in result.x]


def with_steps(symbols: int, layer: Sequence[int], edges: Sequence[Edge], turned: set[int], loose: set[Edge]) -> Layered:
    """Edges over several layers cut at every layer between."""
    layers = list(layer)
    short: list[Edge] = []
    turning: set[Edge] = set()
    for a, b in edges:
        here, before = a, len(short)
        for between in range(layer[a] + 1, layer[b]):
            layers.append(between)
            short.append((here, len(layers) - 1))
            here = len(layers) - 1
        short.append((here, b))
        turning |= {short[before]} if (a, b) in loose else set()
    return Layered(tuple(layers), tuple(short), frozenset(turned), frozenset(turning), symbols)
