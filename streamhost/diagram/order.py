"""Evaluation order, and the path of a loop that has no delay."""

from heapq import heapify, heappop, heappush
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from streamhost.diagram.diagram import Diagram


def evaluation_order(diagram: "Diagram") -> tuple[int, ...]:
    """Every node after what it needs now; of the ready nodes, the one created first. The diagram has no delay-free loop."""
    order = _schedule(diagram)
    assert len(order) == len(diagram.nodes), "a delay-free loop passed the checker"
    return tuple(order)


def delay_free_loop(diagram: "Diagram") -> tuple[int, ...]:
    """The nodes of one loop without a delay, in the direction of flow; empty where there is none."""
    stuck = set(range(len(diagram.nodes))) - set(_schedule(diagram))
    if not stuck:
        return ()
    index = min(stuck)
    path: list[int] = []
    seen: dict[int, int] = {}
    while index not in seen:
        seen[index] = len(path)
        path.append(index)
        index = next(s for s in diagram.nodes[index].needs_now if s in stuck)
    return tuple(reversed(path[seen[index] :]))


def _schedule(diagram: "Diagram") -> list[int]:
    nodes = diagram.nodes
    waiting = [len(set(node.needs_now)) for node in nodes]
    wanted_by: list[list[int]] = [[] for _ in nodes]
    for index, node in enumerate(nodes):
        for source in set(node.needs_now):
            wanted_by[source].append(index)
    ready = [index for index, count in enumerate(waiting) if count == 0]
    heapify(ready)
    order: list[int] = []
    while ready:
        index = heappop(ready)
        order.append(index)
        for reader in wanted_by[index]:
            waiting[reader] -= 1
            if waiting[reader] == 0:
                heappush(ready, reader)
    return order
