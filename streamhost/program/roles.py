"""What each node of a diagram becomes when it is put into a format: register, pre-sum, or part of an accumulator.

A sum or product that anything but a sum reads becomes a register; what only sums read, through shifts too, stays in
the accumulator; a `round` is no reader. A sum of stored values that only gains and shifts read is a pre-sum.
"""

from collections.abc import Callable
from dataclasses import dataclass

from streamhost.diagram.diagram import Diagram
from streamhost.diagram.nodes import Delay, Gain, Input, Node, Residue, Round, Shift, Sum, Taps


@dataclass(frozen=True)
class Roles:
    """Per node of the diagram, by index."""

    register: tuple[bool, ...]
    pre_sum: tuple[bool, ...]
    delayed: tuple[bool, ...]
    whole: tuple[bool, ...]
    residual: tuple[bool, ...]


def roles_of(diagram: Diagram, pre_sum: str) -> Roles:
    """The roles under a format's `pre_sum`: "exact", "half" (both keep pre-sums out of registers) or "signal"."""
    summed = _summed_only(diagram)
    delayed = _delayed(diagram)
    register = [False] * len(diagram.nodes)
    pre_sums = [False] * len(diagram.nodes)
    for index in diagram.order:
        node = diagram.nodes[index]
        if isinstance(node, Sum):
            pre_sums[index] = node.exact or (pre_sum != "signal" and _is_pre_sum(diagram, index, node, register))
            register[index] = not pre_sums[index] and (node.grow is not None or not summed[index])
        elif isinstance(node, Gain | Taps | Shift):
            register[index] = not summed[index]
    residual = _carried_on(diagram, lambda node: isinstance(node, Residue))
    marked = _carried_on(diagram, lambda node: isinstance(node, Sum) and node.grow is not None)
    whole = tuple(a or b for a, b in zip(residual, marked, strict=True))
    return Roles(tuple(register), tuple(pre_sums), delayed, whole, residual)


def _summed_only(diagram: Diagram) -> list[bool]:
    """Whether only sums read a node, through shifts too."""
    result = [True] * len(diagram.nodes)
    for index in reversed(diagram.order):
        for reader in diagram.readers[index]:
            node = diagram.nodes[reader]
            if isinstance(node, Shift):
                result[index] &= result[reader]
            else:
                result[index] &= isinstance(node, Sum | Round)
    return result


def _delayed(diagram: Diagram) -> tuple[bool, ...]:
    """Whether a delay reads a node, through shifts too; a tapped line is a row of delays."""
    result = [False] * len(diagram.nodes)
    for index in reversed(diagram.order):
        for reader in diagram.readers[index]:
            node = diagram.nodes[reader]
            result[index] |= isinstance(node, Delay | Taps) and node.stores > 0
            result[index] |= isinstance(node, Shift) and result[reader]
    return tuple(result)


def _is_pre_sum(diagram: Diagram, index: int, node: Sum, register: list[bool]) -> bool:
    readers = [diagram.nodes[reader] for reader in diagram.readers[index]]
    if node.grow is not None or not readers or not all(isinstance(reader, Gain | Shift) for reader in readers):
        return False
    return all(_is_stored(diagram, term.source, register) for term in node.terms)


def _is_stored(diagram: Diagram, index: int, register: list[bool]) -> bool:
    """A register, input or delay, or a shift of one."""
    while isinstance(diagram.nodes[index], Shift) and not register[index]:
        index = diagram.nodes[index].reads[0]
    return register[index] or isinstance(diagram.nodes[index], Input | Delay | Round)


def _carried_on(diagram: Diagram, starts: Callable[[Node], bool]) -> tuple[bool, ...]:
    """Nodes with that property, and the delays (and, in a program, the roundings) that only pass such a value on."""
    result = [starts(node) for node in diagram.nodes]
    todo = [index for index, found in enumerate(result) if found]
    while todo:
        for reader in diagram.readers[todo.pop()]:
            node = diagram.nodes[reader]
            passes = isinstance(node, Delay) or (isinstance(node, Round) and _makes_mark(diagram, node))
            if passes and not result[reader]:
                result[reader] = True
                todo.append(reader)
    return tuple(result)


def _makes_mark(diagram: Diagram, node: Round) -> bool:
    """In a program: the rounding that makes a marked sum's own register."""
    source = diagram.nodes[node.source]
    return isinstance(source, Sum) and source.grow is not None and node.quantizer is not None
