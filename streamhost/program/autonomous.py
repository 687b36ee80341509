"""What goes on by itself in a program: each of its loops alone, and all of them together, without input.

A loop is a strongly connected component of the graph: what reaches itself through a delay. What only loops drive is added
for the whole. All else is 0 without input once its memory has run out, since every rounding of 0 is 0, and a term that
is 0 leaves a running sum as it is, in any accumulator. Parts of a program are programs, of the same arithmetic.
"""

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from streamhost.diagram.diagram import Diagram
from streamhost.diagram.graph import loops, reachable
from streamhost.diagram.nodes import Delay, Input, Node, Sum, Taps
from streamhost.program.prepare import with_sources
from streamhost.program.program import Arithmetic, Number, Program, SumArithmetic

LONGEST_LINE = 256
"""Words of delay that are taken apart into single delays, all lines together."""

Integers = NDArray[np.int64]


@dataclass(frozen=True, eq=False)
class Part:
    """A program of single delays, made of some of a program's nodes.

    `origins`: for each node, that of the whole; `words`: for each delay in order of nodes, the storing node of the whole
    and the age of the word, 0 for the newest. `program` keeps the inputs of the whole where it has any.
    """

    program: Program
    origins: tuple[int, ...]
    words: tuple[tuple[int, int], ...]

    def rows(self, whole: Program, frame: int) -> list[int]:
        """Where the words stand in the memory of the whole program's kernel, before a frame."""
        found = []
        for node, age in self.words:
            stores = whole.nodes[node].stores
            found.append(whole.state_offsets[node] + (frame - 1 - age) % stores)
        return found


def loops_of(program: Program) -> tuple[tuple[int, ...], ...]:
    """The nodes of each loop, a loop before those that it drives."""
    return tuple(tuple(loop) for loop in loops(program.diagram.readers))


def has_lines(program: Program, nodes: tuple[int, ...]) -> bool:
    """Whether a part of these nodes holds a tapped line, or lines too long to be taken apart."""
    kept = [program.nodes[index] for index in nodes]
    longer = sum(node.n for node in kept if isinstance(node, Delay) and node.n > 1)
    return longer > LONGEST_LINE or any(isinstance(node, Taps) for node in kept)


def driven_by_loops(program: Program) -> tuple[int, ...]:
    """All loops and what they drive, ascending."""
    return tuple(reachable(program.diagram.readers, [index for loop in loops_of(program) for index in loop]))


def part_of(program: Program, nodes: tuple[int, ...]) -> Part:
    """The program of some nodes, ascending, all others 0; its delays single. Not of nodes that hold tapped lines."""
    assert not has_lines(program, nodes), "a part has single delays"
    made = _Maker(program, nodes)
    return made.part()


class _Maker:
    """Copies nodes in order, a line of n words as n delays of which the last is the one that is read."""

    def __init__(self, program: Program, nodes: tuple[int, ...]) -> None:
        self.program, self.kept = program, nodes
        self.place: dict[int, int] = {}
        self.origins: list[int] = []
        for index in nodes:
            node = program.nodes[index]
            copies = node.n if isinstance(node, Delay) else 1
            self.origins += [index] * copies
            self.place[index] = len(self.origins) - 1

    def part(self) -> Part:
        nodes: list[Node] = []
        words: list[tuple[int, int]] = []
        for at, index in enumerate(self.origins):
            node = self.program.nodes[index]
            if isinstance(node, Delay):
                age = at - (self.place[index] - node.n + 1)
                words.append((index, age))
                nodes.append(Delay(node.label, at - 1 if age else self.place[node.source]))
            else:
                nodes.append(self.node(node))
        whole = self.program
        diagram = Diagram(tuple(nodes), whole.diagram.slots, whole.diagram.values)
        part = replace(whole, diagram=diagram, arithmetic=tuple(map(self.arithmetic, self.origins)), numbers=self.numbers())
        return Part(part, tuple(self.origins), tuple(words))

    def node(self, node: Node) -> Node:
        if isinstance(node, Sum):
            terms = tuple(replace(t, source=self.place[t.source]) for t in node.terms if t.source in self.place)
            return replace(node, terms=terms)
        return node if isinstance(node, Input) else with_sources(node, self.place.__getitem__)

    def arithmetic(self, index: int) -> Arithmetic:
        """A sum's terms name what they read behind its shifts, and are left out where that is not kept."""
        found, node = self.program.arithmetic[index], self.program.nodes[index]
        if not isinstance(found, SumArithmetic) or not isinstance(node, Sum):
            return found
        kept = [replace(arithmetic, source=self.place[arithmetic.source])
                for term, arithmetic in zip(node.terms, found.terms, strict=True) if term.source in self.place]
        return replace(found, terms=tuple(kept))

    def numbers(self) -> tuple[Number, ...]:
        return tuple(self.program.numbers[index] for index in self.origins)
