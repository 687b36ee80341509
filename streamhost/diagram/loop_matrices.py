"""The loops of a diagram as matrices of polynomials in z^-1, exact: what its poles come from."""

from fractions import Fraction

from streamhost.diagram.diagram import Diagram
from streamhost.diagram.graph import loops
from streamhost.diagram.nodes import Delay, Gain, Input, Output, Residue, Round, Shift, Sum, Taps
from streamhost.diagram.rows import tap_weights

Entry = dict[int, Fraction]
"""A polynomial in z^-1: {power: coefficient}."""

SparseRow = dict[tuple[int, int], Fraction]
"""A value as a sum over (node with memory, frames ago) of what drives that node."""


def loop_matrices(diagram: Diagram, channel: int = 0) -> list[list[list[Entry]]]:
    """I - W of each loop, W what drives its delays and taps as polynomials in what drove them.

    The determinant of each is a factor of the denominator, and what no loop contains has the factor 1.
    """
    driven = _driven(diagram, channel)
    return [[[_entry(driven[i], i, j) for j in loop] for i in loop] for loop in _loops(driven)]


def memories_of_loops(diagram: Diagram, channel: int = 0) -> list[list[int]]:
    """The delays and taps of each loop, in the order of `loop_matrices`."""
    return _loops(_driven(diagram, channel))


def _loops(driven: dict[int, SparseRow]) -> list[list[int]]:
    memories = list(driven)
    position = {node: i for i, node in enumerate(memories)}
    reads = [sorted({position[m] for m, _ in row}) for row in driven.values()]
    return [[memories[i] for i in loop] for loop in loops(reads)]


def _entry(row: SparseRow, node: int, memory: int) -> Entry:
    entry = {power: -c for (m, power), c in row.items() if m == memory and c}
    if node == memory:
        entry[0] = Fraction(1)
    return entry


def _driven(diagram: Diagram, channel: int) -> dict[int, SparseRow]:
    """For each node with memory, what drives it."""
    coefficients = [Fraction(float(c)) for c in diagram.values[:, channel]]
    rows: list[SparseRow] = [{} for _ in diagram.nodes]
    for index in diagram.order:
        rows[index] = _row(diagram, index, rows, coefficients)
    return {index: rows[node.reads[0]] for index, node in enumerate(diagram.nodes) if node.stores}


def _row(diagram: Diagram, index: int, rows: list[SparseRow], coefficients: list[Fraction]) -> SparseRow:
    match diagram.nodes[index]:
        case Input() | Residue():
            return {}
        case Output(source=source) | Round(source=source):
            return rows[source]
        case Delay(n=n):
            return {(index, n): Fraction(1)}
        case Gain(source=source, coefficient=slot):
            return _combined([(coefficients[slot], rows[source])])
        case Shift(source=source, k=k):
            return _combined([(Fraction(2) ** k, rows[source])])
        case Sum(terms=terms):
            return _combined([(Fraction(term.sign), rows[term.source]) for term in terms])
        case Taps(source=source) as taps:
            weights = list(map(Fraction, tap_weights(taps, coefficients, Fraction(0))))
            line = {(index, i): weight for i, weight in enumerate(weights[1:], start=1)}
            return _combined([(weights[0], rows[source]), (Fraction(1), line)])
        case node:
            raise AssertionError(f"no linear equation for a {node.kind}")


def _combined(terms: list[tuple[Fraction, SparseRow]]) -> SparseRow:
    result: SparseRow = {}
    for factor, row in terms:
        for key, c in row.items():
            result[key] = result.get(key, Fraction(0)) + factor * c
    return {key: c for key, c in result.items() if c}
