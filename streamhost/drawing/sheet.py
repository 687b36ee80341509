"""What is drawn: symbols and the wires between them, made of a diagram's nodes."""

import re
from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass, field
from functools import cached_property

from streamhost.diagram import Delay, Diagram, Gain, Input, Node, Output, Residue, Round, Shift, Sum, Taps
from streamhost.diagram.graph import loops
from streamhost.diagram.hints import Part, Place, Point, Trunk
from streamhost.drawing import text
from streamhost.drawing.symbols import (
    COLUMN,
    MARK,
    MOST_ON_CIRCLE,
    RADIUS,
    SIDES,
    TERMINAL,
    TRIANGLE,
    Cell,
    Symbol,
    box,
    pill,
)
from streamhost.drawing.text import Label

NOWHERE = Place((0.0, 0.0))


@dataclass(frozen=True)
class Wire:
    """From a symbol to a symbol, by their indices; `sign` -1: it is subtracted."""

    source: int
    sink: int
    sign: int = 1


@dataclass(frozen=True)
class Sheet:
    """Symbols, wires, and for some sources the cells that their wire runs through first."""

    symbols: tuple[Symbol, ...]
    wires: tuple[Wire, ...]
    trunks: Mapping[int, tuple[Cell, ...]]

    @cached_property
    def looped(self) -> frozenset[int]:
        """The wires that are part of a loop."""
        after: list[list[int]] = [[] for _ in self.symbols]
        for wire in self.wires:
            after[wire.source].append(wire.sink)
        loop_of = {symbol: number for number, loop in enumerate(loops(after)) for symbol in loop}
        return frozenset(index for index, wire in enumerate(self.wires)
                         if wire.source in loop_of and loop_of[wire.source] == loop_of.get(wire.sink))

    @cached_property
    def sinks(self) -> dict[int, list[int]]:
        """The wires of each net, by its source."""
        found: dict[int, list[int]] = {}
        for index, wire in enumerate(self.wires):
            found.setdefault(wire.source, []).append(index)
        return found


@dataclass
class Pen:
    """Draws node after node; `ends` is the symbol that each node's wire leaves from."""

    diagram: Diagram
    places: Mapping[int, Place]
    marked: Collection[int]
    stretch: tuple[float, float]
    values: bool
    symbols: list[Symbol] = field(default_factory=list)
    ends: dict[int, int] = field(default_factory=dict)

    def draw(self, index: int) -> None:
        node, place = self.diagram.nodes[index], self.places.get(index, NOWHERE)
        marked = index in self.marked and not isinstance(node, Round)
        if isinstance(node, Sum):
            self.draw_sum(index, node, place, marked)
        else:
            looks = looks_of(self.diagram, node, place.small, self.values)
            self.put(looks.symbol(index, self.cell(place.at), place.face, marked))
        self.ends[index] = len(self.symbols) - 1

    def draw_sum(self, index: int, node: Sum, place: Place, marked: bool) -> None:
        parts = place.parts or (Part(place.at, len(node.terms), place.face),)
        assert sum(part.terms for part in parts) == len(node.terms), f"the parts of {node.label} take all its terms"
        for number, part in enumerate(parts):
            inputs = part.terms + (number > 0)
            round_one = inputs <= MOST_ON_CIRCLE
            looks = Looks("sum" if round_one else "pill", (RADIUS, RADIUS) if round_one else pill(inputs), inputs=inputs)
            last = number == len(parts) - 1
            self.put(looks.symbol(index, self.cell(part.at), part.face, marked and last, number))

    def put(self, symbol: Symbol) -> None:
        self.symbols.append(symbol)

    def cell(self, point: Point) -> Cell:
        return round(point[0] * COLUMN * self.stretch[0]), round(point[1] * COLUMN * self.stretch[1])

    def wires(self) -> list[Wire]:
        found: list[Wire] = []
        for index, node in enumerate(self.diagram.nodes):
            if isinstance(node, Sum):
                found += self.sum_wires(index, node)
            else:
                found += [Wire(self.ends[source], self.ends[index]) for source in node.reads]
        return found

    def trunks(self, said: Sequence[Trunk]) -> dict[int, tuple[Cell, ...]]:
        found: dict[int, tuple[Cell, ...]] = {}
        for trunk in said:
            source = self.ends[trunk.source]
            found[source] = found.get(source, ()) + tuple(map(self.cell, trunk.points))
        for index, place in self.places.items():
            first = self.ends[index] - len(place.parts) + 1
            found.update((first + number, tuple(map(self.cell, part.way)))
                         for number, part in enumerate(place.parts) if part.way)
        return found

    def sum_wires(self, index: int, node: Sum) -> list[Wire]:
        found: list[Wire] = []
        terms = list(reversed(node.terms))
        first = self.ends[index] - len(self.places.get(index, NOWHERE).parts or (None,)) + 1
        for adder in range(first, self.ends[index] + 1):
            chained = adder > first
            found += [Wire(adder - 1, adder)] if chained else []
            for _ in range(self.symbols[adder].inputs - chained):
                term = terms.pop()
                found.append(Wire(self.ends[term.source], adder, term.sign))
        return found


@dataclass(frozen=True)
class Looks:
    """How a node is drawn wherever it stands."""

    kind: str
    half: tuple[float, float]
    text: Label = ()
    name: Label = ()
    value: Label = ()
    inputs: int = 1

    def symbol(self, node: int, at: Cell, face: str, marked: bool, part: int = 0) -> Symbol:
        return Symbol(self.kind, node, part, at, SIDES.index(face), self.half, self.text, self.name, self.value, self.inputs,
                      marked)


def looks_of(diagram: Diagram, node: Node, small: bool, values: bool) -> Looks:
    """The looks of every node but a sum; `values`: a gain with its value (that of the first channel)."""
    match node:
        case Input():
            return Looks("input", (TERMINAL, TERMINAL), name=text.signal(node.label), inputs=0)
        case Output():
            return Looks("output", (TERMINAL, TERMINAL), name=text.signal(node.label))
        case Gain():
            value = text.short_number(float(diagram.values[node.coefficient, 0])) if values else ()
            return Looks("gain", (TRIANGLE, TRIANGLE), name=text.coefficient(diagram.slots[node.coefficient].label),
                         value=value)
        case Shift():
            return Looks("gain", (TRIANGLE, TRIANGLE), name=text.power_of_two(node.k))
        case Round():
            return Looks("mark", (MARK / 2, MARK / 2)) if small else Looks("round", box(()))
        case Delay():
            return boxed("delay", text.delay(node.n))
        case Taps():
            return boxed("taps", taps_text(diagram, node))
        case Residue():
            return boxed("residue", (text.Run("e", italic=True),))
    raise AssertionError(f"no looks for a {node.kind}")


def taps_text(diagram: Diagram, node: Taps) -> Label:
    """What stands in the box of a tapped line: its first and its last tap."""
    first = diagram.slots[node.coefficients[0]].label if node.coefficients else node.label
    return text.tap_names(re.sub(r"\d+$", "", first), node.length)


def boxed(kind: str, label: Label) -> Looks:
    return Looks(kind, box(label), text=label)


def sheet_of(
    diagram: Diagram, marked: Collection[int] = (), *, values: bool = False, apart: tuple[float, float] = (1.0, 1.0)
) -> Sheet:
    """The drawing's symbols and wires; at their places if the diagram's maker said them, else all at one.

    `values`: the gains have theirs beside them. `apart`: columns and rows so much further apart.
    """
    places = diagram.hints.places_for(diagram.nodes)
    pen = Pen(diagram, places or {}, shown_marks(diagram, marked), apart, values)
    for index in range(len(diagram.nodes)):
        pen.draw(index)
    return Sheet(tuple(pen.symbols), tuple(pen.wires()), pen.trunks(diagram.hints.trunks if places else ()))


def shown_marks(diagram: Diagram, marked: Collection[int]) -> set[int]:
    """The marked nodes that get a square of their own."""
    return {index for index in marked if not is_rounded_next(diagram, index)}


def is_rounded_next(diagram: Diagram, index: int) -> bool:
    """Whether all that reads a node is drawn as a rounding, which shows it already."""
    readers = diagram.readers[index]
    return bool(readers) and all(isinstance(diagram.nodes[reader], Round) for reader in readers)


def has_upright_marks(diagram: Diagram, marked: Collection[int]) -> bool:
    """Whether a symbol that faces up or down carries a mark."""
    places = diagram.hints.places_for(diagram.nodes) or {}
    return any(places[index].face in "NS" for index in shown_marks(diagram, marked) if index in places)
