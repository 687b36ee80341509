"""Rewriting a diagram before the pass: what the rules say in words about some nodes, said with nodes instead.

A product that no sum reads is a sum of one term. A halved pre-sum is a shift right and a register before the multiplier,
and a shift left behind it.
"""

from collections.abc import Callable
from dataclasses import replace
from functools import partial

from streamhost.diagram.diagram import Diagram
from streamhost.diagram.nodes import Delay, Gain, Node, Round, Shift, Sum, Taps, Term
from streamhost.formats import Quantizer
from streamhost.program.roles import roles_of


class Rewriter:
    """Copies a diagram node by node; nodes may be put after others, and what reads a node may be turned elsewhere."""

    def __init__(self, diagram: Diagram) -> None:
        self.diagram = diagram
        self.nodes: list[Node] = []
        self.place: dict[int, int] = {}
        self.seen_as: dict[int, int] = {}

    def copy(self, index: int) -> int:
        """Append the node; its sources are still those of the original."""
        self.nodes.append(self.diagram.nodes[index])
        self.place[index] = len(self.nodes) - 1
        return self.place[index]

    def put(self, node: Node) -> int:
        """Append a node whose sources are places of the new diagram."""
        self.nodes.append(node)
        return len(self.nodes) - 1

    def finish(self, redirected: Callable[[int, int], int]) -> Diagram:
        """Resolve the sources of the copied nodes: `redirected(reader, source)` is the place in the new diagram."""
        for index, place in self.place.items():
            self.nodes[place] = with_sources(self.nodes[place], partial(redirected, index))
        return replace(self.diagram, nodes=tuple(self.nodes))


def with_sources(node: Node, place: Callable[[int], int]) -> Node:
    """The node with each of its sources replaced."""
    if isinstance(node, Sum):
        return replace(node, terms=tuple(Term(term.sign, place(term.source)) for term in node.terms))
    if node.reads:
        return replace(node, source=place(node.reads[0]))  # type: ignore[call-arg]
    return node


def separate_products(diagram: Diagram, pre_sum: str) -> Diagram:
    """Give every product that is a register, or that a `round` reads, a sum of one term to stand in."""
    roles = roles_of(diagram, pre_sum)
    rewriter = Rewriter(diagram)
    lone: dict[int, int] = {}
    for index, node in enumerate(diagram.nodes):
        place = rewriter.copy(index)
        if isinstance(node, Gain) and (roles.register[index] or _round_reads(diagram, index)):
            lone[index] = rewriter.put(Sum(f"{node.label}.sum", (Term(1, place),)))

    def redirected(reader: int, source: int) -> int:
        turned = source in lone and (roles.register[source] or isinstance(diagram.nodes[reader], Round | Shift))
        return lone[source] if turned else rewriter.place[source]

    return rewriter.finish(redirected) if lone else diagram


def _round_reads(diagram: Diagram, index: int) -> bool:
    """Whether a `round` reads a node, through shifts too."""
    todo = [index]
    while todo:
        for reader in diagram.readers[todo.pop()]:
            if isinstance(diagram.nodes[reader], Round):
                return True
            if isinstance(diagram.nodes[reader], Shift):
                todo.append(reader)
    return False


def halve_pre_sums(diagram: Diagram, signal: Quantizer) -> Diagram:
    """Put the shift and the register of `pre_sum = "half"` before each multiplier of a pre-sum, and the shift behind it."""
    roles = roles_of(diagram, "half")
    rewriter = Rewriter(diagram)
    halved: dict[int, int] = {}
    doubled: dict[int, int] = {}
    for index, node in enumerate(diagram.nodes):
        place = rewriter.copy(index)
        multiplied = any(isinstance(diagram.nodes[reader], Gain) for reader in diagram.readers[index])
        if roles.pre_sum[index] and multiplied and isinstance(node, Sum) and (k := (len(node.terms) - 1).bit_length()):
            rewriter.nodes[place] = replace(node, exact=True)
            shift = rewriter.put(Shift(f"{node.label}.half", place, -k))
            halved[index] = rewriter.put(Round(f"{node.label}.halved", shift, signal))
        if isinstance(node, Gain) and roles.pre_sum[node.source] and isinstance(pre := diagram.nodes[node.source], Sum):
            shift = rewriter.put(Shift(f"{node.label}.double", place, (len(pre.terms) - 1).bit_length()))
            alone = roles.register[index] or _round_reads(diagram, index)
            doubled[index] = rewriter.put(Sum(f"{node.label}.sum", (Term(1, shift),))) if alone else shift

    def redirected(reader: int, source: int) -> int:
        if isinstance(diagram.nodes[reader], Gain) and source in halved:
            return halved[source]
        return doubled.get(source, rewriter.place[source])

    return rewriter.finish(redirected)


def unfold_lines(diagram: Diagram) -> Diagram:
    """Write folded lines as delays, pairs, gains and a sum: their pairs then are sums and registers like any other.

    A new node refers to another new one by the complement of its place, until all places are known.
    """
    nodes: list[Node] = []
    place: dict[int, int] = {}
    for index, node in enumerate(diagram.nodes):
        if isinstance(node, Taps) and node.fold is not None:
            _put_pairs(nodes, node)
        else:
            nodes.append(node)
        place[index] = len(nodes) - 1
    placed = tuple(with_sources(node, lambda source: place[source] if source >= 0 else ~source) for node in nodes)
    return replace(diagram, nodes=placed)


def _put_pairs(nodes: list[Node], line: Taps) -> None:
    """Delays first, then each pair's sum and its gain, from both ends inwards; the sum of all last."""
    past = [line.source]
    for k in range(1, line.length):
        nodes.append(Delay(f"{line.label}.x{k}", past[-1]))
        past.append(~(len(nodes) - 1))
    products = []
    for k, slot in enumerate(line.coefficients):
        last = line.length - 1 - k
        operand = past[k]
        if last != k:
            pair = (Term(1, past[k]), Term(1 if line.fold == "even" else -1, past[last]))
            nodes.append(Sum(f"{line.label}.pair{k}", pair))
            operand = ~(len(nodes) - 1)
        nodes.append(Gain(f"{line.label}.g{k}", operand, slot))
        products.append(Term(1, ~(len(nodes) - 1)))
    nodes.append(Sum(line.label, tuple(products)))
