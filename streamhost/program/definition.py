"""The definition: a program run on Python integers, or on floats operation by operation.

Slow and obviously right. Every other back end must agree with it to the last bit, in every form, format, rounding and
overflow.
"""

from collections import deque
from collections.abc import Sequence
from dataclasses import dataclass, field

from streamhost.diagram.nodes import Delay, Gain, Input, Output, Residue, Round, Shift, Sum, Taps
from streamhost.formats import Fixed, Quantizer
from streamhost.program.dither import dither_key, dither_value
from streamhost.program.integers import overflowed, rounded
from streamhost.program.program import Program, RoundArithmetic, SumArithmetic, TapsArithmetic, TermArithmetic


@dataclass
class Counters:
    """What happened: per node, how often it saturated or wrapped, or overflowed its accumulator."""

    saturations: dict[int, int] = field(default_factory=dict)
    wraps: dict[int, int] = field(default_factory=dict)
    accumulator_overflows: dict[int, int] = field(default_factory=dict)


class FixedDefinition:
    """One channel of a fixed-point program, from reset. `run` takes input codes and gives one list of codes an output."""

    def __init__(self, program: Program, channel: int = 0) -> None:
        assert isinstance(program.format, Fixed) and program.stored is not None, "a fixed-point program"
        self.program, self.channel = program, channel
        self.seed = program.format.dither_seed
        self.codes = [row[min(channel, len(row) - 1)] for row in program.stored.codes]
        self.nodes, self.numbers = program.nodes, program.numbers
        self.counters = Counters()
        self.frame = 0
        self.lines = {i: deque([0] * node.stores) for i, node in enumerate(self.nodes) if node.stores}
        self.value: dict[int, int] = {}
        self.exact: dict[int, int] = {}
        self.dropped: dict[int, int] = {}

    def run(self, codes: Sequence[int]) -> list[tuple[int, ...]]:
        """Output codes, one tuple a frame, for input codes of the input's word."""
        return [self.step(code) for code in codes]

    def step(self, code: int) -> tuple[int, ...]:
        """One frame: every value from what was stored, then everything is stored."""
        outputs = []
        for index in self.program.diagram.order:
            node = self.nodes[index]
            self.value[index] = self.evaluate(index, code)
            if isinstance(node, Output):
                outputs.append(self.output_code(index))
        for index, line in self.lines.items():
            line.append(self.value[self.nodes[index].reads[0]])
            line.popleft()
        self.frame += 1
        return tuple(outputs)

    def output_code(self, index: int) -> int:
        """An output's value as a code of the output's word, which holds it."""
        assert isinstance(self.program.format, Fixed), "a fixed-point program"
        return self.value[index] << self.program.format.output.word.fraction - self.numbers[index].fraction

    def evaluate(self, index: int, code: int) -> int:
        node, arithmetic = self.nodes[index], self.program.arithmetic[index]
        if isinstance(node, Input):
            return code
        if isinstance(node, Delay):
            return self.lines[index][0]
        if isinstance(node, Gain):
            return self.codes[node.coefficient] * self.value[node.source]
        if isinstance(node, Shift):
            self.exact[index] = self.exact.get(node.source, self.value[node.source]) << max(0, node.k)
            return self.value[node.source] << max(0, node.k)
        if isinstance(node, Sum):
            assert isinstance(arithmetic, SumArithmetic), "a sum has its arithmetic"
            return self.sum(index, arithmetic)
        if isinstance(node, Taps):
            assert isinstance(arithmetic, TapsArithmetic), "a tapped line has its arithmetic"
            return self.taps(index, node, arithmetic)
        if isinstance(node, Round):
            assert isinstance(arithmetic, RoundArithmetic), "a rounding has its arithmetic"
            return self.round(index, self.value[node.source], arithmetic)
        if isinstance(node, Residue):
            return self.dropped.get(node.source, 0)
        return self.value[node.reads[0]]

    # sums

    def sum(self, index: int, arithmetic: SumArithmetic) -> int:
        total = exact = 0
        for term in arithmetic.terms:
            value, unbounded = self.term(term, arithmetic.accumulator.fraction)
            total = self.added(total, term.sign, value, arithmetic)
            exact += term.sign * unbounded
        self.note_overflow(index, arithmetic, total, exact)
        return total

    def term(self, term: TermArithmetic, fraction: int) -> tuple[int, int]:
        """A term in the accumulator's fraction, and the same as it would be had no accumulator overflowed."""
        value = self.value[term.source]
        return self.aligned(term, value, fraction), self.aligned(term, self.exact.get(term.source, value), fraction)

    def aligned(self, term: TermArithmetic, value: int, fraction: int) -> int:
        at = self.numbers[term.source].fraction
        if term.keep is not None and term.keep < at:
            value, at = rounded(value, at - term.keep, term.rounding), term.keep
        value <<= max(0, term.shift)
        return rounded(value, at + max(0, -term.shift) - fraction, "floor")

    def added(self, total: int, sign: int, value: int, arithmetic: SumArithmetic | TapsArithmetic) -> int:
        """One term added to the running sum, which overflows as the accumulator says."""
        word, overflow = arithmetic.accumulator.word, arithmetic.accumulator.overflow
        if word is None:
            return total + sign * value
        if overflow == "saturate":
            value = overflowed(value, word, overflow)
        return overflowed(total + sign * value, word, overflow)

    def note_overflow(self, index: int, arithmetic: SumArithmetic | TapsArithmetic, total: int, exact: int) -> None:
        self.exact[index] = exact
        if arithmetic.counted and total != exact:
            count(self.counters.accumulator_overflows, index)

    # tapped lines

    def taps(self, index: int, node: Taps, arithmetic: TapsArithmetic) -> int:
        line = [self.value[node.source], *reversed(self.lines.get(index, ()))]
        if node.last_first:
            line.reverse()
        fraction, total, exact = arithmetic.accumulator.fraction, 0, 0
        for i, slot in enumerate(node.coefficients):
            operand, at, halved = self.tap_operand(index, node, arithmetic, line, i)
            product, at = self.codes[slot] * operand, at + self.stored_fraction(slot)
            keep = min(arithmetic.keeps[i], at)
            value = rounded(rounded(product, at - keep, arithmetic.rounding) << halved, keep - fraction, "floor")
            total = self.added(total, 1, value, arithmetic)
            exact += value
        self.note_overflow(index, arithmetic, total, exact)
        return total

    def stored_fraction(self, slot: int) -> int:
        assert self.program.stored is not None, "a fixed-point program"
        return self.program.stored.words[slot].fraction

    def tap_operand(
        self, index: int, node: Taps, arithmetic: TapsArithmetic, line: list[int], i: int
    ) -> tuple[int, int, int]:
        """What multiplication i reads, its fraction bits, and the shift left behind it."""
        at, last = self.numbers[node.source].fraction, node.length - 1 - i
        pre_ordinal, ordinal = arithmetic.ordinals[i]
        if node.fold is None or last == i:
            quantizer = arithmetic.operand if node.fold is None else arithmetic.middle
            return *self.quantized(index, line[i], at, quantizer, ordinal), 0
        pair = line[i] + line[last] if node.fold == "even" else line[i] - line[last]
        pair, at = self.quantized(index, pair, at + arithmetic.halved, arithmetic.pre, pre_ordinal)
        return *self.quantized(index, pair, at, arithmetic.operand, ordinal), arithmetic.halved

    def quantized(
        self, index: int, value: int, at: int, quantizer: Quantizer | None, ordinal: int | None
    ) -> tuple[int, int]:
        """A value inside a tapped line after a quantizer, and its fraction bits."""
        if quantizer is None:
            return value, at
        drop = at - quantizer.word.fraction
        return self.round(
            index, value, RoundArithmetic(quantizer, drop, ordinal), residue=False
        ), quantizer.word.fraction

    # registers

    def round(self, index: int, value: int, arithmetic: RoundArithmetic, *, residue: bool = True) -> int:
        quantizer, drop = arithmetic.quantizer, arithmetic.drop
        dithered = value
        if quantizer.dither and arithmetic.ordinal is not None:
            dithered += dither_value(dither_key(self.seed, arithmetic.ordinal, self.channel), self.frame, drop)
        code = rounded(dithered, drop, quantizer.rounding)
        if residue:
            self.dropped[index] = value - (code << drop) if drop > 0 else 0
        result = overflowed(code, quantizer.word, quantizer.overflow)
        if result != code:
            count(self.counters.saturations if quantizer.overflow == "saturate" else self.counters.wraps, index)
        return result


def count(counters: dict[int, int], index: int) -> None:
    counters[index] = counters.get(index, 0) + 1
