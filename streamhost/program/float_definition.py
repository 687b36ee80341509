"""The definition in floating point: every operation done alone, in the drawn order, in its own type."""

from collections import deque
from collections.abc import Sequence

import numpy as np

from streamhost.diagram.nodes import Delay, Gain, Input, Output, Residue, Round, Shift, Sum, Taps
from streamhost.formats import Float
from streamhost.program.fused import Real, fused_multiply_add
from streamhost.program.program import Program

TYPES: dict[str, type[Real]] = {"float32": np.float32, "float64": np.float64}


class FloatDefinition:
    """One channel of a floating-point program, from reset. `run` takes and gives values of the format's type."""

    def __init__(self, program: Program, channel: int = 0) -> None:
        assert isinstance(program.format, Float), "a floating-point program"
        self.program, self.format, self.nodes = program, program.format, program.nodes
        column = program.diagram.values[:, min(channel, program.diagram.channels - 1)]
        self.type, self.sum_type = TYPES[self.format.type], TYPES[self.format.sum_type]
        self.coefficients = [self.type(value) for value in column]
        self.lines = {i: deque([self.kind(i)(0.0)] * node.stores) for i, node in enumerate(self.nodes) if node.stores}
        self.value: dict[int, Real] = {}

    def kind(self, index: int) -> type[Real]:
        node = self.nodes[index]
        return TYPES[self.program.types[node.source if isinstance(node, Taps) else index]]

    def run(self, values: Sequence[float]) -> list[tuple[Real, ...]]:
        """Output values, one tuple a frame."""
        with np.errstate(all="ignore"):
            return [self.step(value) for value in values]

    def step(self, value: float) -> tuple[Real, ...]:
        outputs = []
        for index in self.program.diagram.order:
            node = self.nodes[index]
            self.value[index] = self.type(value) if isinstance(node, Input) else self.evaluate(index)
            if isinstance(node, Output):
                outputs.append(self.value[index])
        for index, line in self.lines.items():
            line.append(self.flushed(self.value[self.nodes[index].reads[0]]))
            line.popleft()
        return tuple(outputs)

    def flushed(self, value: Real) -> Real:
        """What is stored: 0 for a subnormal value where the format says so."""
        if self.format.flush_subnormals and abs(float(value)) < float(np.finfo(type(value)).tiny):
            return type(value)(0.0)
        return value

    def evaluate(self, index: int) -> Real:
        node = self.nodes[index]
        if isinstance(node, Delay):
            return self.lines[index][0]
        if isinstance(node, Gain):
            return self.product(node.coefficient, self.value[node.source])
        if isinstance(node, Shift):
            value = self.value[node.source]
            return value * type(value)(2.0**node.k)
        if isinstance(node, Sum):
            return self.sum(node)
        if isinstance(node, Taps):
            return self.taps(index, node)
        if isinstance(node, Round):
            return self.type(self.value[node.source])
        if isinstance(node, Residue):
            return self.residue(node)
        return self.value[node.reads[0]]

    def residue(self, node: Residue) -> Real:
        register = self.nodes[node.source]
        if not isinstance(register, Round) or self.format.sum_type == self.format.type:
            return self.sum_type(0.0)
        return self.sum_type(self.value[register.source]) - self.sum_type(self.value[node.source])

    def product(self, slot: int, value: Real) -> Real:
        return self.sum_type(self.coefficients[slot]) * self.sum_type(value)

    def sum(self, node: Sum) -> Real:
        total: Real | None = None
        for term in node.terms:
            source = self.nodes[term.source]
            value = self.sum_type(self.value[term.source])
            signed = value if term.sign > 0 else -value
            if total is None:
                total = signed
            elif self.format.fused and isinstance(source, Gain):
                total = self.fused(term.sign, source.coefficient, self.value[source.source], total)
            else:
                total = total + signed
        assert total is not None, "a sum has a term"
        return total

    def fused(self, sign: int, slot: int, value: Real, total: Real) -> Real:
        return fused_multiply_add(
            self.sum_type(sign) * self.sum_type(self.coefficients[slot]), self.sum_type(value), total
        )

    def taps(self, index: int, node: Taps) -> Real:
        line = [self.value[node.source], *reversed(self.lines.get(index, ()))]
        if node.last_first:
            line.reverse()
        total: Real | None = None
        for i, slot in enumerate(node.coefficients):
            operand = self.tap_operand(node, line, i)
            if total is None:
                total = self.product(slot, operand)
            elif self.format.fused:
                total = self.fused(1, slot, operand, total)
            else:
                total = total + self.product(slot, operand)
        assert total is not None, "a tapped line has a tap"
        return total

    def tap_operand(self, node: Taps, line: list[Real], i: int) -> Real:
        """What a multiplier reads: a tap, or a pair's sum, made where sums are made and read in the operand's type."""
        last = node.length - 1 - i
        if node.fold is None or last == i:
            return line[i]
        first, second = self.sum_type(line[i]), self.sum_type(line[last])
        return self.type(first + second if node.fold == "even" else first - second)
