"""What must follow what: the longest chain around a loop per frame, and from input to output.

A frame cannot begin before what it needs of earlier frames is there: around a loop of k delays the latencies of its operations
add up, and one frame takes at least that sum over k, the largest over all loops (the maximum cycle ratio, or iteration bound:
Renfors & Neuvo, IEEE Trans. Circuits and Systems 28, 1981). No width of a machine helps against it, only another structure.
Floating-point sums are added in the drawn order, so that an early term waits for all later additions; sums of integers that do
not saturate may be added in any order, and a term in a loop waits for one.
"""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from fractions import Fraction

from streamhost.diagram.graph import loops
from streamhost.diagram.nodes import Delay, Gain, Output, Residue, Round, Shift, Sum, Taps
from streamhost.formats import Float
from streamhost.profile.machine import Latencies, latencies
from streamhost.profile.operations import could_saturate, has_residue, term_operations
from streamhost.program.program import Program, RoundArithmetic, SumArithmetic, TapsArithmetic


@dataclass(frozen=True)
class Edge:
    """What reads what, how many cycles later its result is there, and how many frames later that is."""

    source: int
    reader: int
    cycles: int
    delays: int = 0


@dataclass(frozen=True)
class Loop:
    """A closed path, its nodes in the direction of flow, and cycles per frame around it."""

    cycles_per_frame: Fraction
    nodes: tuple[int, ...]


def slowest_loop(program: Program) -> Loop | None:
    """The loop that bounds how fast frames can follow each other; None without a loop."""
    found = list(edges(program))
    position = {index: place for place, index in enumerate(program.diagram.order)}
    slowest: Loop | None = None
    for component in loops(program.diagram.readers):
        inside = set(component)
        own = sorted((edge for edge in found if edge.source in inside and edge.reader in inside),
                     key=lambda edge: position[edge.source])
        slowest = slowest_among(own, slowest)
    return slowest


def longest_way(program: Program) -> int:
    """Cycles from a sample's coming in until the last output that depends on it in the same frame is there."""
    ready = dict.fromkeys(program.diagram.inputs, 0)
    into: list[list[Edge]] = [[] for _ in program.nodes]
    for edge in edges(program):
        if not edge.delays:
            into[edge.reader].append(edge)
    for index in program.diagram.order:
        times = [ready[edge.source] + edge.cycles for edge in into[index] if edge.source in ready]
        if times:
            ready[index] = max(times)
    return max((ready[index] for index in program.diagram.outputs if index in ready), default=0)


def slowest_among(edges: Sequence[Edge], known: Loop | None = None) -> Loop | None:
    """The slowest loop of these edges, or the known one where none is slower. Every loop has a delay.

    Every loop that is found raises the ratio that the next must exceed, until there is none.
    """
    slowest = known
    while loop := _loop_above(edges, slowest.cycles_per_frame if slowest is not None else Fraction(-1)):
        slowest = loop
    return slowest


def _loop_above(edges: Sequence[Edge], ratio: Fraction) -> Loop | None:
    """A loop of more cycles per delay than `ratio`: longest paths, each edge less what its delays allow it.

    Edges in evaluation order of their sources: one pass settles everything between two delays.
    """
    nodes = {node for edge in edges for node in (edge.source, edge.reader)}
    longest, by = dict.fromkeys(nodes, 0), dict[int, Edge]()
    for _ in range(len(nodes) + 1):
        changed = False
        for edge in edges:
            length = longest[edge.source] + edge.cycles * ratio.denominator - edge.delays * ratio.numerator
            if length > longest[edge.reader]:
                longest[edge.reader], by[edge.reader], changed = length, edge, True
        if not changed:
            return None
        if found := _closed(by):
            delays = sum(edge.delays for edge in found)
            return Loop(Fraction(sum(edge.cycles for edge in found), delays), tuple(edge.source for edge in found))
    raise AssertionError("a longest path longer than all nodes closes")


def _closed(by: dict[int, Edge]) -> list[Edge]:
    """The edges of a loop among those by which the longest paths came, in the direction of flow."""
    settled: set[int] = set()
    for start in by:
        path: list[int] = []
        at = start
        while at in by and at not in settled:
            settled.add(at)
            path.append(at)
            at = by[at].source
        if at in path:
            return [by[node] for node in reversed(path[path.index(at) :])]
    return []


def edges(program: Program) -> Iterator[Edge]:
    """Every edge of the program with its latency."""
    for index, node in enumerate(program.nodes):
        if isinstance(node, Delay):
            yield Edge(node.source, index, 0, node.n)
        elif isinstance(node, Sum):
            yield from _into_sum(program, index, node)
        elif isinstance(node, Taps):
            yield from _into_taps(program, index, node)
        elif isinstance(node, Gain | Shift | Round | Residue | Output):
            yield Edge(node.source, index, _latency(program, index))


def _latency(program: Program, index: int) -> int:
    node = program.nodes[index]
    if isinstance(node, Gain):
        return 0 if _fused(program, index) else latencies(program, index).multiply
    if isinstance(node, Shift):
        return latencies(program, index).shift if program.types else 0  # an integer's shift is in its term or register
    if isinstance(node, Residue):
        return latencies(program, index).add if has_residue(program, node) else 0
    if not isinstance(node, Round):
        return 0
    if program.types:
        return latencies(program, index).round if program.types[index] != program.types[node.source] else 0
    found, each = program.arithmetic[index], latencies(program, node.source)
    assert isinstance(found, RoundArithmetic), "a register"
    moved = 0 if not found.drop else each.round if found.drop > 0 else each.shift
    return moved + (each.saturate if could_saturate(program, index) else 0)


def _fused(program: Program, index: int) -> bool:
    """Whether a product is made in the fused additions that read it."""
    readers = program.diagram.readers[index]
    return isinstance(program.format, Float) and program.format.fused and all(
        isinstance(program.nodes[reader], Sum) for reader in readers)


def _into_sum(program: Program, index: int, node: Sum) -> Iterator[Edge]:
    each, count, found = latencies(program, index), len(node.terms), program.arithmetic[index] if program.arithmetic else None
    for k, term in enumerate(node.terms):
        later = count - max(k, 1)
        cycles = later * each.add
        if isinstance(found, SumArithmetic):
            before = term_operations(program, found.terms[k], found.accumulator.fraction)
            cycles = sum(latencies(program, found.terms[k].source).of(operation.kind) for operation in before)
            saturates = found.accumulator.overflow == "saturate"
            cycles += (later * each.add + (count - k) * each.saturate) if saturates else min(later, 1) * each.add
        elif isinstance(program.nodes[term.source], Gain) and _fused(program, term.source):
            cycles = later * each.fused + (each.multiply if k == 0 else 0)
        yield Edge(term.source, index, cycles)


def _into_taps(program: Program, index: int, node: Taps) -> Iterator[Edge]:
    each, count = latencies(program, index), len(node.coefficients)
    found = program.arithmetic[index] if program.arithmetic else None
    for tap in range(node.length):
        place = node.length - 1 - tap if node.last_first else tap
        if node.fold is not None:
            place = min(tap, node.length - 1 - tap, count - 1)
        later = count - max(place, 1)
        cycles = each.multiply + (each.add if node.fold else 0)
        if isinstance(found, TapsArithmetic):
            cycles += _tap_latency(each, found, place, later)
        else:
            cycles += later * each.add
        yield Edge(node.source, index, cycles, tap)


def _tap_latency(each: Latencies, found: TapsArithmetic, place: int, later: int) -> int:
    """From a product to the sum, quantizers of the operand among them; a product's own rounding is left out."""
    quantizers = sum(ordinal is not None for ordinal in found.ordinals[place])
    if found.accumulator.overflow == "saturate":
        return quantizers * each.round + later * each.add + (later + 1) * each.saturate
    return quantizers * each.round + min(later, 1) * each.add
