"""The pass that puts a diagram into a fixed-point format: graph to graph, every rounding made explicit.

Nodes are visited in evaluation order; the width and the rounding of a node are decided in the same visit. A second
pass over the result changes no bit. The rules are those of DEVELOPERS.md, "Where roundings go".
"""

from dataclasses import replace

from streamhost.diagram.diagram import Diagram
from streamhost.diagram.nodes import Delay, Gain, Input, Node, Output, Round, Sum, Term
from streamhost.formats import Fixed, Quantizer
from streamhost.program.coefficients import store
from streamhost.program.numbers import annotate
from streamhost.program.prepare import halve_pre_sums, separate_products, unfold_lines, with_sources
from streamhost.program.program import Program
from streamhost.program.roles import Roles, roles_of
from streamhost.program.widths import Widths


def lower_fixed(drawn: Diagram, format: Fixed) -> Program:
    """The program of a diagram in a fixed-point format.

    Raises FormatError where a coefficient, an accumulator or a loop cannot be as the format asks.
    """
    diagram = negate_feedback(drawn) if format.feedback == "negated" else drawn
    if format.pre_sum == "half":
        diagram = halve_pre_sums(diagram, format.signal)
    if format.pre_sum == "signal" and not format.accumulator.full:
        diagram = unfold_lines(diagram)
    diagram = separate_products(diagram, format.pre_sum)
    stored = store(diagram, format)
    roles = roles_of(diagram, format.pre_sum)
    widths = Widths(diagram, roles, format, stored.words)
    rounded, sources = RoundingPass(diagram, roles, widths, format).run()
    rounded = rounded.with_values(stored.values(diagram.channels))
    return annotate(Program(drawn, rounded, format, stored=stored), widths, sources)


def negate_feedback(diagram: Diagram) -> Diagram:
    """Coefficients marked as feedback stored with their sign turned, their terms added instead of subtracted."""
    turned = {i for i, slot in enumerate(diagram.slots) if slot.feedback}
    slots = tuple(
        replace(slot, label=f"-{slot.label}", feedback=False) if slot.feedback else slot for slot in diagram.slots
    )
    values = diagram.values.copy()
    values[sorted(turned)] *= -1.0
    gains = {i for i, node in enumerate(diagram.nodes) if isinstance(node, Gain) and node.coefficient in turned}
    nodes = tuple(_turn_terms(node, gains) for node in diagram.nodes)
    for node in nodes:
        assert isinstance(node, Sum) or not gains.intersection(node.reads), "feedback is subtracted at an adder"
    return Diagram(nodes, slots, values)


def _turn_terms(node: Node, gains: set[int]) -> Node:
    if not isinstance(node, Sum):
        return node
    return replace(node, terms=tuple(Term(-t.sign, t.source) if t.source in gains else t for t in node.terms))


class RoundingPass:
    """Makes the new graph; `raw` and `value` say where a node stands in it before and after its register."""

    def __init__(self, diagram: Diagram, roles: Roles, widths: Widths, format: Fixed) -> None:
        self.diagram, self.roles, self.widths, self.format = diagram, roles, widths, format
        self.nodes: list[Node] = []
        self.origin: list[int] = []
        self.raw: dict[int, int] = {}
        self.value: dict[int, int] = {}
        self.made: dict[tuple[int, Quantizer], int] = {}

    def run(self) -> tuple[Diagram, tuple[int, ...]]:
        """The graph with its roundings, and for each of its nodes the node of the diagram that it comes from."""
        for index in self.diagram.order:
            self.visit(index)
        for place, (node, origin) in enumerate(zip(self.nodes, self.origin, strict=True)):
            if isinstance(node, Delay):
                source = self.diagram.nodes[origin].reads[0]
                self.nodes[place] = replace(node, source=self.value[source])
        return replace(self.diagram, nodes=tuple(self.nodes)), tuple(self.origin)

    def visit(self, index: int) -> None:
        node = self.diagram.nodes[index]
        if isinstance(node, Round):
            self.value[index] = self.raw[index] = self.visit_round(index, node)
        elif isinstance(node, Output):
            self.put(index, replace(node, source=self.quantized(index, node.source, self.format.output)))
        elif isinstance(node, Gain):
            self.visit_gain(index, node)
        elif isinstance(node, Delay | Input):
            self.put(index, node)
        else:
            if isinstance(node, Sum):
                node = replace(node, exact=self.roles.pre_sum[index])
            self.put(index, with_sources(node, self.value.__getitem__))
            if self.roles.register[index]:
                self.value[index] = self.round(index, self.raw[index], self.widths.quantizer(index))

    def visit_round(self, index: int, node: Round) -> int:
        quantizer = self.widths.quantizer(index)
        source = self.diagram.nodes[node.source]
        makes_mark = isinstance(source, Sum) and source.grow is not None
        if self.widths.residue_asked(index) and not makes_mark:
            return self.round(index, self.value[node.source], quantizer)
        return self.quantized(index, node.source, quantizer)

    def visit_gain(self, index: int, node: Gain) -> None:
        operand = self.widths.operand(node.source).quantizer
        source = self.value[node.source]
        if operand is not None:
            source = self.quantized(index, node.source, operand)
        self.put(index, replace(node, source=source))

    def put(self, index: int, node: Node) -> int:
        self.nodes.append(node)
        self.origin.append(index)
        self.raw[index] = self.value[index] = len(self.nodes) - 1
        return self.raw[index]

    def quantized(self, reader: int, source: int, quantizer: Quantizer) -> int:
        """Where a value stands after a quantizer: where it stood, if its word already holds it."""
        place = self.value[source]
        word = self.widths.stored_word(source)
        if word is not None and quantizer.word.holds(word):
            return place
        return self.round(reader, place, quantizer)

    def round(self, index: int, place: int, quantizer: Quantizer) -> int:
        """A rounding of a value; the same value into the same word by the same rule is one rounding."""
        key = (place, quantizer)
        if key not in self.made:
            label = f"{self.nodes[place].label}.{'q' if self.origin[place] == index else 'o'}{len(self.made)}"
            self.nodes.append(Round(label, place, quantizer))
            self.origin.append(index)
            self.made[key] = len(self.nodes) - 1
        return self.made[key]
