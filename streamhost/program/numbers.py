"""The numbers beside a program's nodes: fractions, bounds, how each term enters its accumulator, ordinals."""

from dataclasses import replace
from itertools import count

from streamhost.diagram.nodes import Delay, Gain, Input, Output, Residue, Round, Shift, Sum, Taps, Term
from streamhost.errors import FormatError
from streamhost.formats import Fixed, Quantizer, Word
from streamhost.program.program import (
    Accumulator,
    Arithmetic,
    Number,
    Program,
    RoundArithmetic,
    SumArithmetic,
    TapsArithmetic,
    TermArithmetic,
    carrier_bits,
)
from streamhost.program.widths import Widths, growth


def annotate(program: Program, widths: Widths, origins: tuple[int, ...]) -> Program:
    """The program with `numbers` and `arithmetic` filled in; `origins` maps its nodes to those of the widths' diagram."""
    notes = Annotation(program, widths, origins)
    for index in program.diagram.order:
        notes.visit(index)
    arithmetic = tuple(notes.arithmetic.get(i) for i in range(len(program.nodes)))
    numbers = tuple(notes.numbers[i] for i in range(len(program.nodes)))
    return replace(program, arithmetic=arithmetic, numbers=numbers)


class Annotation:
    """One walk in evaluation order."""

    def __init__(self, program: Program, widths: Widths, origins: tuple[int, ...]) -> None:
        assert isinstance(program.format, Fixed) and program.stored is not None, "fixed point only"
        self.program, self.widths, self.origins = program, widths, origins
        self.format, self.stored = program.format, program.stored
        self.nodes = program.nodes
        self.numbers: dict[int, Number] = {}
        self.exact: dict[int, int] = {}
        self.arithmetic: dict[int, Arithmetic] = {}
        self.ordinals = count(1)

    def visit(self, index: int) -> None:
        node = self.nodes[index]
        if isinstance(node, Sum):
            self.visit_sum(index, node)
        elif isinstance(node, Taps):
            self.visit_taps(index, node)
        elif isinstance(node, Round):
            self.visit_round(index, node)
        elif isinstance(node, Input):
            self.numbers[index] = word_number(self.format.input.word)
        elif isinstance(node, Delay):
            self.numbers[index] = self.stored_number(index)
        elif isinstance(node, Gain):
            self.visit_gain(index, node)
        elif isinstance(node, Shift):
            self.visit_shift(index, node)
        elif isinstance(node, Residue):
            self.numbers[index] = self.residue_number(node)
        else:
            assert isinstance(node, Output), "a node kind without numbers"
            self.numbers[index] = self.numbers[node.source]

    def visit_gain(self, index: int, node: Gain) -> None:
        source = self.numbers[node.source]
        fraction = source.fraction + self.stored.words[node.coefficient].fraction
        self.numbers[index] = Number(fraction, self.largest_code(node.coefficient) * source.bound)

    def largest_code(self, slot: int) -> int:
        return max(abs(code) for code in self.stored.codes[slot])

    def visit_shift(self, index: int, node: Shift) -> None:
        source, left = self.numbers[node.source], max(0, node.k)
        self.numbers[index] = Number(source.fraction + max(0, -node.k), source.bound << left)
        self.exact[index] = self.exact.get(node.source, source.bound) << left

    def visit_round(self, index: int, node: Round) -> None:
        assert node.quantizer is not None, "a program states every quantizer"
        drop = self.numbers[node.source].fraction - node.quantizer.word.fraction
        self.arithmetic[index] = RoundArithmetic(node.quantizer, drop, self.ordinal(drop))
        self.numbers[index] = word_number(node.quantizer.word)

    def ordinal(self, drop: int) -> int | None:
        return next(self.ordinals) if drop > 0 else None

    def stored_number(self, index: int) -> Number:
        """The number of what drives a delay, found without visiting it."""
        while isinstance(node := self.nodes[index], Delay):
            index = node.source
        if isinstance(node, Residue):
            return self.residue_number(node)
        if isinstance(node, Input):
            return word_number(self.format.input.word)
        assert isinstance(node, Round) and node.quantizer is not None, "a delay stores what stands in a word"
        return word_number(node.quantizer.word)

    def residue_number(self, node: Residue) -> Number:
        register = self.nodes[node.source]
        if not isinstance(register, Round) or register.quantizer is None:
            return Number(self.fraction(node.source), 0)
        fraction = self.fraction(register.source)
        drop = max(0, fraction - register.quantizer.word.fraction)
        return Number(fraction, 1 << drop + 2 * register.quantizer.dither)

    def fraction(self, index: int) -> int:
        """Fraction bits of any value that a register or a residue reads, found without visiting it."""
        extra = 0
        while not isinstance(node := self.nodes[index], Sum | Taps | Input | Round):
            if isinstance(node, Shift):
                extra += max(0, -node.k)
            index = self.nodes[node.source].reads[0] if isinstance(node, Residue) else node.reads[0]
        if isinstance(node, Round):
            assert node.quantizer is not None, "a program states every quantizer"
            return extra + node.quantizer.word.fraction
        if isinstance(node, Input):
            return extra + self.format.input.word.fraction
        return extra + self.widths.raw(self.origins[index])

    # sums

    def visit_sum(self, index: int, node: Sum) -> None:
        fraction = self.widths.raw(self.origins[index])
        terms, total = [], 0
        for term in node.terms:
            arithmetic, bound = self.term(term, fraction)
            terms.append(arithmetic)
            total += bound
        accumulator = self.accumulator(index, fraction, total, exact=node.exact)
        self.arithmetic[index] = SumArithmetic(tuple(terms), accumulator, self.counted(index, accumulator))

    def term(self, term: Term, fraction: int) -> tuple[TermArithmetic, int]:
        """A term as it enters the accumulator, and the largest magnitude that it brings."""
        source, shift = term.source, 0
        while isinstance(node := self.nodes[source], Shift):
            shift += node.k
            source = node.source
        number, rounding, keep = self.numbers[source], "floor", None
        bound, at = self.exact.get(source, number.bound), number.fraction
        if isinstance(node, Gain):
            keep = min(at, fraction - max(0, -shift))
            if not self.widths.roles.residual[self.origins[source]] and not self.is_residual(node):
                rounding = self.format.product.rounding
                limit = self.format.product.fraction
                keep = keep if limit is None else min(keep, limit)
            bound = aligned(bound, keep - at)
            at = keep
        at += max(0, -shift)
        return TermArithmetic(term.sign, source, shift, keep, rounding), aligned(bound << max(0, shift), fraction - at)

    def is_residual(self, gain: Gain) -> bool:
        return self.widths.roles.residual[self.origins[gain.source]]

    def accumulator(self, index: int, fraction: int, total: int, *, exact: bool) -> Accumulator:
        """Where a sum of that largest magnitude is made; fills in the sum's number."""
        if total >= 1 << 127:
            label = self.nodes[index].label
            raise FormatError(
                f'The sum "{label}" may need {total.bit_length() + 1} bits, and at most 128 can be carried. Use '
                f"shorter words, or let products keep fewer bits."
            )
        word = None if exact else self.word_of_accumulator(fraction)
        bound = total if word is None else min(total, -word.low)
        self.numbers[index] = Number(fraction, bound)
        self.exact[index] = total
        return Accumulator(fraction, word, self.format.accumulator.overflow, carrier_bits(total))

    def word_of_accumulator(self, fraction: int) -> Word | None:
        rule = self.format.accumulator
        if rule.word is not None:
            return rule.word
        return None if rule.bits is None else Word(rule.bits - fraction, fraction)

    def counted(self, index: int, accumulator: Accumulator) -> bool:
        """Whether a sum that may overflow leaves its accumulator here, for a register."""
        todo = [index] if accumulator.word is not None else []
        while todo:
            for reader in self.program.diagram.readers[todo.pop()]:
                if isinstance(self.nodes[reader], Round):
                    return True
                if isinstance(self.nodes[reader], Shift):
                    todo.append(reader)
        return False

    # tapped lines

    def visit_taps(self, index: int, node: Taps) -> None:
        source = self.numbers[node.source]
        word = Word(source.bound.bit_length() - source.fraction, source.fraction)
        pre, halved, operand, middle = self.operands(index, node, word)
        fraction = self.widths.raw(self.origins[index])
        read = [
            pre_operand(
                i == len(node.coefficients) - 1 and node.fold == "even" and node.length % 2 == 1,
                pre,
                operand,
                middle,
                word,
                node.fold,
                halved,
            )
            for i in range(len(node.coefficients))
        ]
        keeps, ordinals, total = [], [], 0
        for slot, (into, pre_drop, operand_drop) in zip(node.coefficients, read, strict=True):
            product = into.fraction + self.stored.words[slot].fraction
            limit = self.format.product.fraction
            keep = min(product, fraction) if limit is None else min(product, fraction, limit)
            bound = aligned(self.largest_code(slot) * -into.low, keep - product)
            total += aligned(bound << halved, fraction - keep)
            keeps.append(keep)
            ordinals.append((self.ordinal(pre_drop), self.ordinal(operand_drop)))
        accumulator = self.accumulator(index, fraction, total, exact=False)
        self.arithmetic[index] = TapsArithmetic(
            accumulator,
            tuple(keeps),
            self.format.product.rounding,
            self.counted(index, accumulator),
            pre,
            halved,
            operand,
            middle,
            tuple(ordinals),
        )

    def operands(
        self, index: int, node: Taps, word: Word
    ) -> tuple[Quantizer | None, int, Quantizer | None, Quantizer | None]:
        """(register of a pair's sum, its shift right, operand of a pair or tap, operand of the middle tap)."""
        reader = self.widths.diagram.nodes[self.origins[index]]
        place = self.widths.operand(reader.reads[0]).quantizer
        middle = None if place is None or place.word.holds(word) else place
        if node.fold is None:
            return None, 0, middle, None
        if self.format.pre_sum != "exact":
            halved = 1 if self.format.pre_sum == "half" else 0
            signal = self.format.signal
            operand = self.format.operand
            return signal, halved, None if operand.word.holds(signal.word) else operand, middle
        grown = growth([(1, word, 0), (1 if node.fold == "even" else -1, word, 0)])
        wide = self.format.operand.with_word(self.format.operand.word.widened(grown))
        return None, 0, None if wide.word.holds(word.widened(grown)) else wide, middle


def pre_operand(
    is_middle: bool,
    pre: Quantizer | None,
    operand: Quantizer | None,
    middle: Quantizer | None,
    word: Word,
    fold: str | None,
    halved: int,
) -> tuple[Word, int, int]:
    """What a multiplier of a tapped line reads: its word, and the bits dropped at the pair's register and the operand."""
    if is_middle or fold is None:
        chosen = middle if is_middle else operand
        into = chosen.word if chosen else word
        return into, 0, word.fraction - into.fraction
    pair = pre.word if pre else word.widened(growth([(1, word, 0), (1 if fold == "even" else -1, word, 0)]))
    pre_drop = word.fraction + halved - pair.fraction if pre else 0
    into = operand.word if operand else pair
    return into, pre_drop, pair.fraction - into.fraction


def word_number(word: Word) -> Number:
    return Number(word.fraction, -word.low)


def aligned(bound: int, left: int) -> int:
    """The largest magnitude after a shift left, or right with a rounding."""
    return bound << left if left >= 0 else (bound >> -left) + 1
