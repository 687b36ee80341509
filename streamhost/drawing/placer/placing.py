"""From layers and orders to cells."""

from collections.abc import Sequence
from dataclasses import replace
from itertools import pairwise
from math import ceil, inf

import numpy as np

from streamhost.drawing.placer.layers import Edge, Layered, integers, layered
from streamhost.drawing.placer.order import Columns, ordered
from streamhost.drawing.sheet import Sheet
from streamhost.drawing.symbols import GRID, WEST, Symbol

ROOM = 5
"""Cells between two columns besides half their symbols and one for each wire that turns there."""

APART = 4
APART_FROM_WIRE = 3
WIRES_APART = 2
SMALL_STEP = 4

STRAIGHTNESS = (1, 2, 6)
"""What a cell of height costs between two symbols, a symbol and a bend point, two bend points."""

LOOSE = 0.25
"""The same where a wire turns back."""

IN_LINE = frozenset({"input", "output", "delay"})


def placed(sheet: Sheet, looseness: float = 1.0, in_line: float = 0.0) -> Sheet:
    """The sheet with a cell and a face for every symbol; `looseness` widens the gaps.

    `in_line`: what a cell of height costs more beside an input, an output or a delay.
    """
    graph = layered(sheet)
    columns = ordered(graph)
    rows = heights(sheet, graph, columns, looseness, in_line)
    across = column_places(sheet, graph, columns, rows, looseness)
    symbols = [replace(symbol, at=(across[graph.layer[i]], rows[i]), face=WEST if i in graph.turned else symbol.face)
               for i, symbol in enumerate(sheet.symbols)]
    return replace(sheet, symbols=tuple(symbols), trunks={})


def heights(sheet: Sheet, graph: Layered, columns: Columns, looseness: float, in_line: float) -> list[int]:
    """The rows of least total height difference along the edges, the order of each column kept."""
    count = len(graph.layer)
    gaps = [(a, b, round(distance(sheet, graph, a, b) * looseness))
            for column in columns for a, b in pairwise(column)]
    least = list(gaps)
    weights = [0.0] * count
    for a, b in graph.edges:
        # |v[a] - v[b]| = top - bottom with top >= both >= bottom
        bottom, top = len(weights), len(weights) + 1
        weight = straightness(sheet, graph, (a, b), in_line)
        weights += [-weight, weight]
        least += [(v, top, 0) for v in (a, b)] + [(bottom, v, 0) for v in (a, b)]
    return straightened(integers(np.array(weights), least)[:count], graph, gaps)


def straightness(sheet: Sheet, graph: Layered, edge: Edge, in_line: float) -> float:
    """What a cell of height between two vertices costs."""
    if edge in graph.loose:
        return LOOSE
    main = any(v < graph.symbols and sheet.symbols[v].kind in IN_LINE for v in edge)
    return STRAIGHTNESS[sum(v >= graph.symbols for v in edge)] + (in_line if main else 0.0)


def straightened(rows: list[int], graph: Layered, gaps: Sequence[tuple[int, int, int]]) -> list[int]:
    """Vertices moved to the row of a neighbour where that takes small steps out of wires and there is room."""
    others: list[list[int]] = [[] for _ in rows]
    for a, b in graph.edges:
        if (a, b) not in graph.loose:
            others[a].append(b)
            others[b].append(a)
    above, below = {b: (a, gap) for a, b, gap in gaps}, {a: (b, gap) for a, b, gap in gaps}
    moved = True
    while moved:
        moved = False
        for v, near in enumerate(others):
            low = rows[above[v][0]] + above[v][1] if v in above else -inf
            high = rows[below[v][0]] - below[v][1] if v in below else inf
            wanted = {rows[n] for n in near if 0 < abs(rows[n] - rows[v]) <= SMALL_STEP and low <= rows[n] <= high}
            steps = {row: sum(rows[n] != row for n in near) for row in sorted(wanted)}
            best = min(steps, key=steps.__getitem__, default=None)
            if best is not None and steps[best] < sum(rows[n] != rows[v] for n in near):
                rows[v], moved = best, True
    return rows


def distance(sheet: Sheet, graph: Layered, a: int, b: int) -> int:
    """Least cells between two neighbours of a column, `a` above `b`."""
    if a >= graph.symbols and b >= graph.symbols:
        return WIRES_APART
    halves = sum(half_cells(sheet.symbols[v], 1) for v in (a, b) if v < graph.symbols)
    name = 2 if b < graph.symbols and sheet.symbols[b].name else 0
    return halves + name + (APART if max(a, b) < graph.symbols else APART_FROM_WIRE)


def half_cells(symbol: Symbol, direction: int) -> int:
    return ceil(symbol.reach(direction) / GRID)


def column_places(sheet: Sheet, graph: Layered, columns: Columns, rows: Sequence[int], looseness: float) -> list[int]:
    """Where each layer stands, from the left."""
    halves = [max((half_cells(sheet.symbols[v], 0) for v in column if v < graph.symbols), default=0) for column in columns]
    marks = [2 if any(v < graph.symbols and sheet.symbols[v].marked for v in column) else 0 for column in columns]
    turning = [0] * len(columns)
    for a in {a for a, b in graph.edges if rows[a] != rows[b]}:
        turning[graph.layer[a]] += 1
    places = [0]
    for layer in range(len(columns) - 1):
        room = ROOM + turning[layer] + marks[layer]
        places.append(places[-1] + halves[layer] + halves[layer + 1] + round(room * looseness))
    return places
