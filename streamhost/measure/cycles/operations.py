"""The arithmetic of a part as a list of operations on whole numbers, each on one line of a certificate.

    ["state", v, k]                 v = state k
    ["gain", v, a, slot, z]         v = a * (codes[slot] >> z), z low bits of the code being 0
    ["left", v, a, k]               v = a << k
    ["add", v, a, sign, b]          v = a + sign * b;   ["zero", v]  v = 0
    [rounding, v, a, drop]          v = a without its last bits, rounded as named
    ["saturate", v, a, low, high]   v = a brought into that range;  ["wrap", ...] alike
    ["residue", v, a, q, drop]      v = a - (q << drop)

Low bits that are always 0 are left out where they come up, so that each rounding drops what `noise_sources` says it drops.
"""

from streamhost.diagram.nodes import Delay, Gain, Residue, Round, Shift, Sum
from streamhost.formats import Word
from streamhost.program.program import Program, RoundArithmetic, SumArithmetic, TermArithmetic
from streamhost.program.sources import trailing_zeros

Line = list[str | int]

ENDLESS = 1 << 10
"""Low bits that are 0 in 0."""


class Operations:
    """`lines`, in order; `following`: what each state becomes; `place`: the variable of each node that holds all its bits."""

    def __init__(self, program: Program, channel: int) -> None:
        assert program.stored is not None, "a fixed-point program"
        self.program = program
        self.codes = [row[min(channel, len(row) - 1)] for row in program.stored.codes]
        self.lines: list[Line] = []
        self.place: dict[int, int] = {}
        self.zeros: dict[int, int] = {}
        self.before: dict[int, tuple[int, int, int]] = {}
        self.states = [index for index, node in enumerate(program.nodes) if isinstance(node, Delay)]
        for index in program.diagram.order:
            self.visit(index)
        self.following = [self.full(program.nodes[index].reads[0]) for index in self.states]

    def put(self, kind: str, *arguments: int) -> int:
        self.lines.append([kind, len(self.lines), *arguments])
        return len(self.lines) - 1

    def full(self, index: int) -> int:
        """The variable of a node's value with its low zeros."""
        return self.left(self.place[index], self.zeros[index])

    def left(self, variable: int, k: int) -> int:
        return self.put("left", variable, k) if 0 < k < ENDLESS else variable

    def visit(self, index: int) -> None:
        node, arithmetic = self.program.nodes[index], self.program.arithmetic[index]
        place, zeros = -1, 0
        if isinstance(node, Delay):
            place = self.put("state", self.states.index(index))
        elif isinstance(node, Gain):
            place, zeros = self.gain(node)
        elif isinstance(node, Shift):
            place, zeros = self.place[node.source], self.zeros[node.source] + max(0, node.k)
        elif isinstance(node, Sum):
            assert isinstance(arithmetic, SumArithmetic), "a sum has its arithmetic"
            place, zeros = self.sum(arithmetic)
        elif isinstance(node, Round):
            assert isinstance(arithmetic, RoundArithmetic), "a rounding has its arithmetic"
            place, zeros = self.round(index, node, arithmetic)
        elif isinstance(node, Residue):
            place = self.residue(node)
        else:
            place, zeros = self.place[node.reads[0]], self.zeros[node.reads[0]]
        self.place[index], self.zeros[index] = place, zeros

    def gain(self, node: Gain) -> tuple[int, int]:
        code, source = self.codes[node.coefficient], self.place[node.source]
        if code == 0 or self.zeros[node.source] >= ENDLESS:
            return self.put("zero"), ENDLESS
        low = int(trailing_zeros(code))
        return self.put("gain", source, node.coefficient, low), self.zeros[node.source] + low

    def dropped(self, variable: int, zeros: int, drop: int, rounding: str) -> tuple[int, int]:
        """A value without its last bits, of which `zeros` are 0 and left out; a negative drop gains bits."""
        if zeros >= ENDLESS or drop <= zeros:
            return variable, min(ENDLESS, zeros - drop)
        return self.put(rounding, variable, drop - zeros), 0

    def term(self, term: TermArithmetic, fraction: int) -> tuple[int, int]:
        """A term at its accumulator's fraction."""
        at, value = self.program.numbers[term.source].fraction, (self.place[term.source], self.zeros[term.source])
        if term.keep is not None and term.keep < at:
            value, at = self.dropped(*value, at - term.keep, term.rounding), term.keep
        raised = (value[0], value[1] + max(0, term.shift))
        return self.dropped(*raised, at + max(0, -term.shift) - fraction, "floor")

    def sum(self, arithmetic: SumArithmetic) -> tuple[int, int]:
        word = arithmetic.accumulator.word
        terms = [(term.sign, *self.term(term, arithmetic.accumulator.fraction)) for term in arithmetic.terms]
        least = min(zeros for _, _, zeros in terms)
        if word is not None:
            least = min(least, word.bits - 1) if arithmetic.accumulator.overflow == "wrap" else 0
        total = self.put("zero")
        for sign, variable, zeros in terms:
            value = self.left(variable, zeros - least)
            if word is not None and arithmetic.accumulator.overflow == "saturate":
                value = self.fitted(value, word, 0, "saturate")
            total = self.put("add", total, sign, value)
            if word is not None:
                total = self.fitted(total, word, least, arithmetic.accumulator.overflow)
        return total, least

    def fitted(self, variable: int, word: Word, least: int, overflow: str) -> int:
        return self.put(overflow, variable, word.low >> least, word.high >> least)

    def round(self, index: int, node: Round, arithmetic: RoundArithmetic) -> tuple[int, int]:
        source, zeros = self.place[node.source], self.zeros[node.source]
        code, low = self.dropped(source, zeros, arithmetic.drop, arithmetic.quantizer.rounding)
        code = self.left(code, low)
        self.before[index] = (source, zeros, code)
        return self.fitted(code, arithmetic.quantizer.word, 0, arithmetic.quantizer.overflow), 0

    def residue(self, node: Residue) -> int:
        """Before minus after, in the source's bits, its low zeros among them."""
        arithmetic = self.program.arithmetic[node.source]
        if not isinstance(arithmetic, RoundArithmetic) or arithmetic.drop <= self.before[node.source][1]:
            return self.put("zero")
        source, zeros, code = self.before[node.source]
        return self.left(self.put("residue", source, code, arithmetic.drop - zeros), zeros)
