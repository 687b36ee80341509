"""The order within each layer: barycentre sweeps from several seeded starts, the one with fewest crossings."""

from collections.abc import Sequence
from random import Random

from streamhost.drawing.placer.layers import Edge, Layered

STARTS = 12
SWEEPS = 8

Columns = list[list[int]]


def ordered(graph: Layered) -> Columns:
    """The vertices of each layer from the top down."""
    above, below = neighbours(graph)
    first: Columns = [[] for _ in range(max(graph.layer, default=0) + 1)]
    for vertex, layer in enumerate(graph.layer):
        first[layer].append(vertex)
    best, least = first, crossings(first, graph.edges)
    for seed in range(STARTS):
        columns = [list(column) for column in first]
        if seed:
            rng = Random(seed)
            for column in columns:
                rng.shuffle(column)
        for sweep in range(SWEEPS):
            settle(columns, below if sweep % 2 else above, backwards=bool(sweep % 2))
            found = crossings(columns, graph.edges)
            if found < least:
                best, least = [list(column) for column in columns], found
    return exchanged(best, graph.edges, least)


def neighbours(graph: Layered) -> tuple[list[list[int]], list[list[int]]]:
    """Of each vertex, those in the layer before and those in the layer after."""
    before: list[list[int]] = [[] for _ in graph.layer]
    after: list[list[int]] = [[] for _ in graph.layer]
    for a, b in graph.edges:
        before[b].append(a)
        after[a].append(b)
    return before, after


def settle(columns: Columns, fixed: Sequence[Sequence[int]], *, backwards: bool) -> None:
    """Every column sorted by the mean place of its neighbours on the side that is settled already."""
    place = {vertex: i for column in columns for i, vertex in enumerate(column)}
    for column in reversed(columns) if backwards else columns:
        means = {v: sum(place[n] for n in fixed[v]) / len(fixed[v]) if fixed[v] else place[v] for v in column}
        column.sort(key=lambda vertex: (means[vertex], place[vertex]))
        place.update((vertex, i) for i, vertex in enumerate(column))


def crossings(columns: Columns, edges: Sequence[Edge]) -> int:
    """Pairs of edges between the same two layers whose ends lie the other way round."""
    place = {vertex: (layer, i) for layer, column in enumerate(columns) for i, vertex in enumerate(column)}
    between: dict[int, list[tuple[int, int]]] = {}
    for a, b in edges:
        between.setdefault(place[a][0], []).append((place[a][1], place[b][1]))
    total = 0
    for pairs in between.values():
        pairs.sort()
        total += sum(b > d for i, (a, b) in enumerate(pairs) for c, d in pairs[i + 1:] if a < c)
    return total


def exchanged(columns: Columns, edges: Sequence[Edge], least: int) -> Columns:
    """Neighbours in a column exchanged as long as that removes crossings."""
    better = True
    while better:
        better = False
        for column in columns:
            for i in range(len(column) - 1):
                column[i], column[i + 1] = column[i + 1], column[i]
                found = crossings(columns, edges)
                if found < least:
                    least, better = found, True
                else:
                    column[i], column[i + 1] = column[i + 1], column[i]
    return columns
