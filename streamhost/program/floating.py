"""Putting a diagram into floating point.

Where sums are made in the type of the registers, each operation rounds itself and the graph stays as it is. With a
float64 accumulator over float32, the registers (and what a multiplier reads of a pre-sum) become explicit conversions.
"""

from dataclasses import replace

import numpy as np

from streamhost.diagram.diagram import Diagram
from streamhost.diagram.nodes import Delay, Gain, Input, Node, Output, Round, Shift
from streamhost.formats import Float
from streamhost.program.prepare import separate_products, with_sources
from streamhost.program.program import Program
from streamhost.program.roles import Roles, roles_of


def lower_float(drawn: Diagram, format: Float) -> Program:
    """The program of a diagram in a floating-point format; coefficients are rounded to the format's type."""
    stored = drawn.values.astype(format.type).astype(np.float64)
    if format.sum_type == format.type:
        diagram = drawn.with_values(stored)
        return Program(drawn, diagram, format, types=(format.type,) * len(diagram.nodes))
    separated = separate_products(drawn, "exact")
    diagram = _ConversionPass(separated, roles_of(separated, "exact")).run().with_values(stored)
    return Program(drawn, diagram, format, types=tuple(_type(diagram, i, format) for i in range(len(diagram.nodes))))


def _type(diagram: Diagram, index: int, format: Float) -> str:
    """The type of a node's value."""
    while isinstance(node := diagram.nodes[index], Delay | Shift | Output):
        index = node.source
    return format.type if isinstance(node, Input | Round) else format.sum_type


class _ConversionPass:
    """Makes a graph whose Round nodes convert a sum to the registers' type."""

    def __init__(self, diagram: Diagram, roles: Roles) -> None:
        self.diagram, self.roles = diagram, roles
        self.nodes: list[Node] = []
        self.value: dict[int, int] = {}
        self.made: dict[int, int] = {}

    def run(self) -> Diagram:
        for index in self.diagram.order:
            self.value[index] = self.visit(index)
        for place, node in enumerate(self.nodes):
            if isinstance(node, Delay):
                self.nodes[place] = replace(node, source=self.value[node.source])
        return replace(self.diagram, nodes=tuple(self.nodes))

    def visit(self, index: int) -> int:
        node = self.diagram.nodes[index]
        if isinstance(node, Round):
            return self.converted(node.source)
        if isinstance(node, Delay | Input):
            return self.put(node)
        if isinstance(node, Output):
            return self.put(replace(node, source=self.converted(node.source)))
        if isinstance(node, Gain) and self.roles.pre_sum[node.source]:
            return self.put(replace(node, source=self.converted(node.source)))
        place = self.put(with_sources(node, self.value.__getitem__))
        return self.convert(place) if self.roles.register[index] else place

    def put(self, node: Node) -> int:
        self.nodes.append(node)
        return len(self.nodes) - 1

    def converted(self, source: int) -> int:
        """A value in the registers' type."""
        node = self.diagram.nodes[source]
        stands = self.roles.register[source] or isinstance(node, Input | Delay | Round)
        if stands and not self.roles.residual[source]:
            return self.value[source]
        return self.convert(self.value[source])

    def convert(self, place: int) -> int:
        if place not in self.made:
            self.made[place] = self.put(Round(f"{self.nodes[place].label}.q{len(self.made)}", place))
        return self.made[place]
