"""Walks over directed graphs given as lists of successors; iterative, so that size is no matter."""

from collections.abc import Iterable, Iterator, Sequence

Successors = Sequence[Sequence[int]]


def reachable(successors: Successors, starts: Iterable[int]) -> list[int]:
    """The starts and everything that can be reached from them, ascending."""
    found = set(starts)
    todo = list(found)
    while todo:
        for other in successors[todo.pop()]:
            if other not in found:
                found.add(other)
                todo.append(other)
    return sorted(found)


def loops(successors: Successors) -> list[list[int]]:
    """The strongly connected components in which something reaches itself, members ascending."""
    return [sorted(component) for component in _components(successors)
            if len(component) > 1 or component[0] in successors[component[0]]]


def _components(successors: Successors) -> Iterator[list[int]]:
    """The strongly connected components, by one walk forwards and one backwards (method of Kosaraju and Sharir)."""
    predecessors: list[list[int]] = [[] for _ in successors]
    for vertex, following in enumerate(successors):
        for other in following:
            predecessors[other].append(vertex)
    assigned: set[int] = set()
    for root in reversed(_finishing_order(successors)):
        if root in assigned:
            continue
        assigned.add(root)
        component, todo = [root], [root]
        while todo:
            for other in predecessors[todo.pop()]:
                if other not in assigned:
                    assigned.add(other)
                    component.append(other)
                    todo.append(other)
        yield component


def _finishing_order(successors: Successors) -> list[int]:
    """Every vertex behind all that a depth-first walk finds from it."""
    order: list[int] = []
    seen: set[int] = set()
    for root in range(len(successors)):
        if root in seen:
            continue
        seen.add(root)
        path = [(root, iter(successors[root]))]
        while path:
            vertex, left = path[-1]
            following = next((other for other in left if other not in seen), None)
            if following is None:
                order.append(vertex)
                path.pop()
            else:
                seen.add(following)
                path.append((following, iter(successors[following])))
    return order
