"""The polynomials of a diagram's difference equation, exact and with nothing cancelled.

Every loop is cut at a few nodes. Without them the graph has no loops, so that one pass expresses each node by
polynomials in z^-1 that multiply the inputs and the cut nodes. Then the cut nodes are solved for by Cramer's rule, one
group of nodes that reach each other after the other; the determinants of the groups are the denominator. One cut is
enough for a direct form of any order, transposed or not, so that its equation costs little.
"""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from fractions import Fraction
from graphlib import TopologicalSorter

from streamhost.diagram.diagram import Diagram
from streamhost.diagram.graph import loops, reachable
from streamhost.diagram.nodes import Delay, Gain, Input, Output, Residue, Round, Shift, Sum, Taps
from streamhost.diagram.polynomials import Polynomial, determinant, determinant_bits, product
from streamhost.diagram.rows import tap_weights
from streamhost.errors import DiagramError

MOST_WORK = 2.0**36

Sparse = dict[int, Fraction]
"""A polynomial in z^-1: {power: coefficient}."""

Row = dict[int, Sparse]
"""A node by the inputs, cut nodes and outlets of other groups that it is made of: {node: polynomial}."""


@dataclass(frozen=True)
class Difference:
    """denominator * y = sum of numerators[i] * x_i, in powers of z^-1, lowest first; denominator[0] is 1."""

    numerators: tuple[tuple[Fraction, ...], ...]
    denominator: tuple[Fraction, ...]


def difference(diagram: Diagram, output: int, channel: int = 0) -> Difference:
    """What one output (the index of its node) is, of the coefficients as stored; residues are 0.

    The denominator is the product of the determinants of all loops before the output, whether an input reaches them or
    not: the equation holds from any state. Raises DiagramError where loops meet in so many nodes that solving for them
    would take more than about MOST_WORK word operations.
    """
    reads = _reads(diagram, output)
    groups = _groups(len(diagram.nodes), reads)
    rows = _rows(diagram, reads, groups, channel)
    solution = _Solution(diagram.inputs, rows)
    waiting = groups
    while waiting:
        ready = [group for group in waiting if solution.can_solve(group)]
        assert ready, "two groups of loops depend on each other"
        for group in ready:
            solution.solve(group)
        waiting = [group for group in waiting if group not in ready]
    used = frozenset(groups)
    numerators = solution.combined(rows[output], used)
    return Difference(
        tuple(tuple(numerators.get(i, [])) for i in diagram.inputs), tuple(solution.determinants_of(used)),
    )


@dataclass(frozen=True)
class _Group:
    """Nodes that reach each other: where their loops are cut, and which of them the rest of the diagram reads."""

    members: frozenset[int]
    cuts: tuple[int, ...]
    outlets: tuple[int, ...]


def _groups(count: int, reads: dict[int, tuple[int, ...]]) -> list[_Group]:
    successors = _successors(count, reads)
    groups = []
    for loop in loops(successors):
        members = frozenset(loop)
        outlets = tuple(node for node in loop if not members.issuperset(successors[node]))
        groups.append(_Group(members, _cuts(loop, reads), outlets))
    return groups


def _reads(diagram: Diagram, output: int) -> dict[int, tuple[int, ...]]:
    """What each node on the way to the output is made of; a residue is made of nothing."""
    every = [() if isinstance(node, Residue) else node.reads for node in diagram.nodes]
    return {index: every[index] for index in reachable(every, [output])}


def _successors(count: int, reads: dict[int, tuple[int, ...]]) -> list[list[int]]:
    found: list[list[int]] = [[] for _ in range(count)]
    for index, sources in reads.items():
        for source in dict.fromkeys(sources):
            found[source].append(index)
    return found


def _cuts(loop: Sequence[int], reads: dict[int, tuple[int, ...]]) -> tuple[int, ...]:
    """Nodes without which these, which reach each other, have no loop: where most ways meet first."""
    cuts: list[int] = []
    todo = [list(loop)]
    while todo:
        part = todo.pop()
        position = {node: i for i, node in enumerate(part)}
        inside = [[source for source in dict.fromkeys(reads[node]) if source in position] for node in part]
        leaving = [0] * len(part)
        for sources in inside:
            for source in sources:
                leaving[position[source]] += 1
        cut = max(range(len(part)), key=lambda i: (len(inside[i]) * leaving[i], -i))
        cuts.append(part[cut])
        left = [[] if i == cut else [position[s] for s in sources if position[s] != cut]
                for i, sources in enumerate(inside)]
        todo += [[part[i] for i in smaller] for smaller in loops(left)]
    return tuple(sorted(cuts))


def _rows(diagram: Diagram, reads: dict[int, tuple[int, ...]], groups: Sequence[_Group], channel: int) -> dict[int, Row]:
    """What each node is made of: inputs, cut nodes of its own group, and what it reads of other groups."""
    coefficients = [Fraction(float(c)) for c in diagram.values[:, channel]]
    group_of = {member: group for group in groups for member in group.members}
    cuts = {cut for group in groups for cut in group.cuts}
    graph = {index: () if index in cuts else sources for index, sources in reads.items()}
    order = [index for index in TopologicalSorter(graph).static_order() if index not in cuts]
    rows: dict[int, Row] = {}
    for index in (*order, *sorted(cuts)):
        inside = [source for source in reads[index] if source not in cuts and _are_together(source, index, group_of)]
        seen: dict[int, Row] = {source: {source: {0: Fraction(1)}} for source in reads[index]}
        seen.update((source, rows[source]) for source in inside)
        rows[index] = _row(diagram, index, seen, coefficients)
    return rows


def _are_together(source: int, reader: int, group_of: dict[int, _Group]) -> bool:
    """Whether a reader sees what the source is made of: in its own group, or in none."""
    return source not in group_of or group_of[source] is group_of.get(reader)


def _row(diagram: Diagram, index: int, rows: dict[int, Row], coefficients: Sequence[Fraction]) -> Row:
    one = Fraction(1)
    match diagram.nodes[index]:
        case Input():
            return {index: {0: one}}
        case Residue():
            return {}
        case Output(source=source) | Round(source=source):
            return rows[source]
        case Delay(source=source, n=n):
            return _added([(one, n, rows[source])])
        case Gain(source=source, coefficient=slot):
            return _added([(coefficients[slot], 0, rows[source])])
        case Shift(source=source, k=k):
            return _added([(Fraction(2) ** k, 0, rows[source])])
        case Sum(terms=terms):
            return _added((Fraction(term.sign), 0, rows[term.source]) for term in terms)
        case Taps(source=source) as taps:
            weights = map(Fraction, tap_weights(taps, coefficients, Fraction(0)))
            return _added((weight, age, rows[source]) for age, weight in enumerate(weights))
        case node:
            raise AssertionError(f"no equation for a {node.kind}")


def _added(terms: Iterable[tuple[Fraction, int, Row]]) -> Row:
    """The sum of factor * z^-age * row."""
    result: Row = {}
    for factor, age, row in terms:
        for name, polynomial in row.items():
            into = result.setdefault(name, {})
            for power, c in polynomial.items():
                scaled = c if factor == 1 else factor * c
                into[power + age] = into[power + age] + scaled if power + age in into else scaled
    return {name: kept for name, polynomial in result.items() if (kept := {p: c for p, c in polynomial.items() if c})}


class _Solution:
    """Inputs, cut nodes and outlets solved so far: numerators by input, over the determinants of some groups."""

    def __init__(self, inputs: Iterable[int], rows: dict[int, Row]) -> None:
        self.rows = rows
        self.values: dict[int, dict[int, Polynomial]] = {i: {i: [Fraction(1)]} for i in inputs}
        self.over: dict[int, frozenset[_Group]] = {}
        self.determinants: dict[_Group, Polynomial] = {}

    def can_solve(self, group: _Group) -> bool:
        made_of = {name for node in (*group.cuts, *group.outlets) for name in self.rows[node]}
        return all(name in self.values for name in made_of.difference(group.cuts))

    def solve(self, group: _Group) -> None:
        cuts = group.cuts
        outside = [{name: p for name, p in self.rows[cut].items() if name not in cuts} for cut in cuts]
        matrix = [[_identity_minus(self.rows[cut].get(name, {}), cut == name) for name in cuts] for cut in cuts]
        used = self.used(name for row in outside for name in row)
        driven = [self.combined(row, used) for row in outside]
        inputs = sorted({i for row in driven for i in row})
        _check_work(matrix, len(inputs))
        self.determinants[group] = _determinant(matrix)
        for j, cut in enumerate(cuts):
            self.values[cut] = {i: _determinant(_replaced(matrix, j, [row.get(i, []) for row in driven])) for i in inputs}
            self.over[cut] = used | {group}
        for outlet in set(group.outlets).difference(cuts):
            self.over[outlet] = self.used(self.rows[outlet])
            self.values[outlet] = self.combined(self.rows[outlet], self.over[outlet])

    def used(self, names: Iterable[int]) -> frozenset[_Group]:
        """The groups whose determinants these nodes are over."""
        return frozenset(group for name in names for group in self.over.get(name, ()))

    def combined(self, row: Row, used: frozenset[_Group]) -> dict[int, Polynomial]:
        """The row's numerators by input, over the determinants of the groups `used`."""
        result: dict[int, Sparse] = {}
        for name, polynomial in row.items():
            missing = self.determinants_of(used - self.over.get(name, frozenset()))
            factor = product(_dense(polynomial), missing)
            for i, numerator in self.values[name].items():
                into = result.setdefault(i, {})
                for power, c in enumerate(product(factor, numerator)):
                    into[power] = into.get(power, Fraction(0)) + c
        return {i: _dense(polynomial) for i, polynomial in result.items()}

    def determinants_of(self, groups: Iterable[_Group]) -> Polynomial:
        result: Polynomial = [Fraction(1)]
        for group in groups:
            result = product(result, self.determinants[group])
        return result


def _dense(polynomial: Sparse) -> Polynomial:
    length = max((power for power, c in polynomial.items() if c), default=-1) + 1
    return [polynomial.get(power, Fraction(0)) for power in range(length)]


def _identity_minus(polynomial: Sparse, diagonal: bool) -> Sparse:
    entry = {power: -c for power, c in polynomial.items()}
    if diagonal:
        entry[0] = entry.get(0, Fraction(0)) + 1
    return entry


def _replaced(matrix: Sequence[Sequence[Sparse]], column: int, values: Sequence[Polynomial]) -> list[list[Sparse]]:
    sparse = [{power: c for power, c in enumerate(value) if c} for value in values]
    return [[*row[:column], entry, *row[column + 1:]] for row, entry in zip(matrix, sparse, strict=True)]


def _determinant(matrix: Sequence[Sequence[Sparse]]) -> Polynomial:
    return _dense(matrix[0][0]) if len(matrix) == 1 else determinant(matrix)


def _check_work(matrix: Sequence[Sequence[Sparse]], inputs: int) -> None:
    size = len(matrix)
    if size > 1 and (1 + size * inputs) * size**3 * (determinant_bits(matrix) / 32.0) ** 2 > MOST_WORK:
        raise DiagramError(f"The diagram has loops that meet in {size} nodes, too many for exact coefficients of its "
                           f"equation.")
