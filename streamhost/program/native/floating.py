"""Printing a floating-point program as a kernel's source: one statement a node, each operation in its own type."""

import numpy as np

from streamhost.diagram.nodes import Delay, Gain, Input, Node, Output, Residue, Round, Shift, Sum, Taps
from streamhost.formats import Float
from streamhost.program.native.frame import Variant, close_loops, header, lines, open_loops
from streamhost.program.native.text import Text
from streamhost.program.program import Program


def print_float(program: Program, variant: Variant) -> str:
    """The source of a floating-point kernel."""
    assert not variant.codes, "floats have no codes"
    return FloatPrinter(program, variant).source()


class FloatPrinter:
    """Prints node after node; v{i} is the value of node i."""

    def __init__(self, program: Program, variant: Variant) -> None:
        assert isinstance(program.format, Float), "a floating-point program"
        self.program, self.variant, self.format = program, variant, program.format
        self.nodes, self.text = program.nodes, Text()
        self.type, self.sum_type = self.format.type, self.format.sum_type

    def source(self) -> str:
        header(self.text, self.program, self.variant, "", "float64", f"{self.format.label}: {len(self.nodes)} nodes.")
        open_loops(self.text, self.program, self.variant, f"np.{self.type}({{}})")
        for index in self.program.diagram.order:
            self.print(index, self.nodes[index])
            if self.variant.traced:
                self.text(f"R[n, c, {index}] = np.float64(v{index})")
        self.store()
        close_loops(self.text, self.program, self.variant)
        return str(self.text)

    def print(self, index: int, node: Node) -> None:
        if isinstance(node, Input):
            self.print_input(index)
        elif isinstance(node, Delay):
            place = f"S[{self.program.state_offsets[index]} + p{index}, c]"
            self.text(f"v{index} = " + (f"s{index}" if node.n == 1 else self.cast(self.program.types[index], place)))
        elif isinstance(node, Gain):
            self.text(f"v{index} = {self.product(f'k{node.coefficient}', f'v{node.source}')}")
        elif isinstance(node, Shift):
            self.text(f"v{index} = v{node.source} * {self.cast(self.program.types[index], repr(2.0**node.k))}")
        elif isinstance(node, Sum):
            self.print_sum(index, node)
        elif isinstance(node, Taps):
            self.print_taps(index, node)
        elif isinstance(node, Round):
            self.text(f"v{index} = {self.cast(self.type, f'v{node.source}')}")
        elif isinstance(node, Residue):
            self.print_residue(index, node)
        elif isinstance(node, Output):
            column = self.program.diagram.outputs.index(index)
            self.text(f"v{index} = v{node.source}")
            self.text(f"y[n, {f'{column} * channels + ' if column else ''}c] = np.float64(v{index})")

    @staticmethod
    def cast(kind: str, text: str) -> str:
        return f"np.{kind}({text})"

    def print_input(self, index: int) -> None:
        self.text("z = x[n, c]")
        if self.variant.metered:
            self.text("m0 += np.int64(z != z)")
        self.text(f"v{index} = {self.cast(self.type, '0.0 if z != z else z')}")

    def wide(self, text: str) -> str:
        """A register's value as sums read it."""
        return text if self.type == self.sum_type else self.cast(self.sum_type, text)

    def product(self, coefficient: str, value: str) -> str:
        return f"{self.wide(coefficient)} * {self.wide(value)}"

    def print_sum(self, index: int, node: Sum) -> None:
        first = node.terms[0]
        value = self.wide(f"v{first.source}")
        text = value if first.sign > 0 else f"-{value}"
        for term in node.terms[1:]:
            source = self.nodes[term.source]
            if self.format.fused and isinstance(source, Gain):
                sign = "" if term.sign > 0 else "-"
                text = f"fma({sign}{self.wide(f'k{source.coefficient}')}, {self.wide(f'v{source.source}')}, {text})"
            else:
                text = f"({text} {'+' if term.sign > 0 else '-'} {self.wide(f'v{term.source}')})"
        self.text(f"v{index} = {text}")

    def print_residue(self, index: int, node: Residue) -> None:
        register = self.nodes[node.source]
        if isinstance(register, Round) and self.type != self.sum_type:
            self.text(f"v{index} = {self.wide(f'v{register.source}')} - {self.wide(f'v{node.source}')}")
        else:
            self.text(f"v{index} = {self.cast(self.sum_type, '0.0')}")

    def print_taps(self, index: int, node: Taps) -> None:
        self.text(f"f{index} = {self.operand(index, node, '0')}")
        self.text(f"a{index} = {self.product(self.coefficient(node, '0'), f'f{index}')}")
        if len(node.coefficients) > 1:
            middle = node.fold == "even" and node.length % 2 == 1
            self.text(f"for j in range(1, {len(node.coefficients) - middle}):")
            with self.text.indented():
                self.print_tap(index, node, "j")
            if middle:
                self.print_tap(index, node, str(node.length // 2))
        self.text(f"v{index} = a{index}")

    def coefficient(self, node: Taps, j: str) -> str:
        return self.cast(self.type, f"C[{node.coefficients[0]} + {j}, c]")

    def print_tap(self, index: int, node: Taps, j: str) -> None:
        self.text(f"f{index} = {self.operand(index, node, j)}")
        coefficient, value = self.wide(self.coefficient(node, j)), self.wide(f"f{index}")
        if self.format.fused:
            self.text(f"a{index} = fma({coefficient}, {value}, a{index})")
        else:
            self.text(f"a{index} = a{index} + {coefficient} * {value}")

    def operand(self, index: int, node: Taps, j: str) -> str:
        """What multiplication j reads: a tap, or a pair's sum in the operand's type."""
        last = str(node.length - 1 - int(j)) if j.isdigit() else f"({node.length - 1} - {j})"
        if node.last_first:
            return self.entry(index, node, last)
        if node.fold is None or last == j:
            return self.entry(index, node, j)
        pair = (
            f"{self.wide(self.entry(index, node, j))} {'+' if node.fold == 'even' else '-'} "
            f"{self.wide(self.entry(index, node, last))}"
        )
        return self.cast(self.type, pair)

    def entry(self, index: int, node: Taps, j: str) -> str:
        """The sample j frames back."""
        if j == "0":
            return f"v{node.source}"
        offset, p, words = self.program.state_offsets[index], f"p{index}", node.stores
        place = f"{offset} + ({p} - {j} if {p} >= {j} else {p} - {j} + {words})"
        stored = self.cast(self.program.types[node.source], f"S[{place}, c]")
        return stored if j.isdigit() else f"(v{node.source} if {j} == 0 else {stored})"

    def store(self) -> None:
        single, rings = lines(self.program)
        for index in single:
            self.text(f"s{index} = {self.stored(index)}")
        for index in rings:
            self.text(f"S[{self.program.state_offsets[index]} + p{index}, c] = {self.stored(index)}")

    def stored(self, index: int) -> str:
        """What a delay stores, flushed to 0 where the format says so and the value is subnormal."""
        source = self.nodes[index].reads[0]
        if not self.format.flush_subnormals:
            return f"v{source}"
        kind = self.program.types[source]
        tiny = float(np.finfo(kind).tiny)
        return f"{self.cast(kind, '0.0')} if abs(v{source}) < {self.cast(kind, repr(tiny))} else v{source}"
