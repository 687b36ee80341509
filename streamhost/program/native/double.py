"""Printing a program in double-double arithmetic: each value is the unrounded sum of two float64, about 106 bits.

Only for ideal runs that judge a realization whose own rounding is as fine as that of float64. The operations are those of
Dekker 1971 and Knuth (two-sum), products by one fused multiply-add.
"""

from streamhost.diagram.nodes import Delay, Gain, Input, Node, Output, Residue, Round, Shift, Sum, Taps
from streamhost.program.native.frame import Variant, close_text, header, lines
from streamhost.program.native.text import Text, comment
from streamhost.program.program import Program

OPERATIONS = """
def dd_add(a, b):
    s = a[0] + b[0]
    t = s - a[0]
    e = (a[0] - (s - t)) + (b[0] - t)
    p = a[1] + b[1]
    q = p - a[1]
    f = (a[1] - (p - q)) + (b[1] - q)
    e = e + p
    h = s + e
    g = (e - (h - s)) + f
    r = h + g
    return r, g - (r - h)


def dd_sub(a, b):
    return dd_add(a, (-b[0], -b[1]))


def dd_mul(k, a):
    p = k * a[0]
    e = fma(k, a[1], fma(k, a[0], -p))
    r = p + e
    return r, e - (r - p)
"""


def print_double(program: Program, variant: Variant) -> str:
    """The source of a double-double kernel; its outputs are two columns each, the second what the first lacks."""
    assert not (variant.codes or variant.metered or variant.traced), "an ideal run has no meters"
    return _DoublePrinter(program, variant).source()


class _DoublePrinter:
    def __init__(self, program: Program, variant: Variant) -> None:
        self.program, self.variant, self.nodes, self.text = program, variant, program.nodes, Text()

    def source(self) -> str:
        text = self.text
        header(
            text, self.program, self.variant, OPERATIONS.strip(), "float64", f"double-double: {len(self.nodes)} nodes."
        )
        text("for c in range(channels):")
        text.depth += 1
        single, rings = lines(self.program)
        for slot, entry in enumerate(self.program.diagram.slots):
            text(f"k{slot} = C[{slot}, c]{comment(entry.label)}")
        for index in single:
            text(f"s{index} = {self.word(str(self.program.state_offsets[index]))}")
        for index in rings:
            text(f"p{index} = frame0 % {self.nodes[index].stores}")
        text("for n in range(frames):")
        text.depth += 1
        for index in self.program.diagram.order:
            self.print(index, self.nodes[index])
        self.store(single, rings)
        return str(text)

    @staticmethod
    def word(place: str) -> str:
        return f"(S[2 * ({place}), c], S[2 * ({place}) + 1, c])"

    def print(self, index: int, node: Node) -> None:
        if isinstance(node, Input):
            self.text(f"v{index} = (x[n, c], 0.0)")
        elif isinstance(node, Delay):
            place = f"{self.program.state_offsets[index]} + p{index}"
            self.text(f"v{index} = {f's{index}' if node.n == 1 else self.word(place)}")
        elif isinstance(node, Gain):
            self.text(f"v{index} = dd_mul(k{node.coefficient}, v{node.source})")
        elif isinstance(node, Shift):
            self.text(f"v{index} = (v{node.source}[0] * {2.0**node.k!r}, v{node.source}[1] * {2.0**node.k!r})")
        elif isinstance(node, Sum):
            self.print_sum(index, node)
        elif isinstance(node, Taps):
            self.print_taps(index, node)
        elif isinstance(node, Residue):
            self.text(f"v{index} = (0.0, 0.0)")
        elif isinstance(node, Round):
            self.text(f"v{index} = v{node.source}")
        elif isinstance(node, Output):
            count = len(self.program.diagram.outputs)
            column = self.program.diagram.outputs.index(index)
            self.text(f"y[n, {column} * channels + c] = v{node.source}[0]")
            self.text(f"y[n, {count + column} * channels + c] = v{node.source}[1]")

    def print_sum(self, index: int, node: Sum) -> None:
        first = node.terms[0]
        text = f"v{first.source}" if first.sign > 0 else f"(-v{first.source}[0], -v{first.source}[1])"
        for term in node.terms[1:]:
            text = f"{'dd_add' if term.sign > 0 else 'dd_sub'}({text}, v{term.source})"
        self.text(f"v{index} = {text}")

    def print_taps(self, index: int, node: Taps) -> None:
        self.text(f"a{index} = (0.0, 0.0)")
        self.text(f"for j in range({len(node.coefficients)}):")
        with self.text.indented():
            operand = self.entry(index, node, f"({node.length - 1} - j)" if node.last_first else "j")
            if node.fold is not None:
                last = self.entry(index, node, f"({node.length - 1} - j)")
                pair = f"{'dd_add' if node.fold == 'even' else 'dd_sub'}({operand}, {last})"
                operand = f"{operand} if {node.length - 1} - j == j else {pair}"
            self.text(f"f{index} = {operand}")
            self.text(f"a{index} = dd_add(a{index}, dd_mul(C[{node.coefficients[0]} + j, c], f{index}))")
        self.text(f"v{index} = a{index}")

    def entry(self, index: int, node: Taps, j: str) -> str:
        """The value j frames back."""
        if node.stores == 0:
            return f"v{node.source}"
        p, words = f"p{index}", node.stores
        place = f"{self.program.state_offsets[index]} + ({p} - {j} if {p} >= {j} else {p} - {j} + {words})"
        return f"(v{node.source} if {j} == 0 else {self.word(place)})"

    def store(self, single: list[int], rings: list[int]) -> None:
        for index in single:
            self.text(f"s{index} = v{self.nodes[index].reads[0]}")
        for index in rings:
            place, value = f"2 * ({self.program.state_offsets[index]} + p{index})", f"v{self.nodes[index].reads[0]}"
            self.text(f"S[{place}, c] = {value}[0]")
            self.text(f"S[{place} + 1, c] = {value}[1]")
            self.text(f"p{index} = (p{index} + 1) % {self.nodes[index].stores}")
        self.text.depth -= 1
        for index in single:
            offset = 2 * self.program.state_offsets[index]
            self.text(f"S[{offset}, c] = s{index}[0]")
            self.text(f"S[{offset + 1}, c] = s{index}[1]")
        self.text.depth -= 2
        close_text(self.text)
