"""The numbers beside a program's nodes: fractions, bounds, how each term enters its accumulator, ordinals."""

from dataclasses import replace
from itertools import count

from streamhost.diagram.nodes import Delay, Gain, Input, Output, Residue, Round, Shift, Sum, Taps, Term
from streamhost.formats import Fixed, Quantizer, Word
from streamhost.program.limits import carried, carrier_bits, kept
from streamhost.program.program import (
    Accumulator,
    Arithmetic,
    Number,
    Program,
    RoundArithmetic,
    SumArithmetic,
    TapsArithmetic,
    TermArithmetic,
)
from streamhost.program.widths import Widths, growth

SHORTER = "Shorten operand and coefficients by {excess} together."
SHORTER_SUM = "Shorten operand and coefficients by {excess} together, or state an accumulator of fewer fraction bits."
MARK = "Shorten the signal, or mark the sum with a smaller grow."
PRE_SUM = 'A sum of stored values is multiplied whole: shorten the operand, or state pre_sum = "half" or "signal".'
STORED_RESIDUE = "Let products keep fewer fraction bits: what a register drops is what the accumulator has more than it."
UNDITHERED = "Shorten operand and coefficients by {excess} together, or leave the dither out."


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
        bound = self.largest_code(node.coefficient) * source.bound
        self.numbers[index] = number(fraction, carried(bound, f'The product "{node.label}"', SHORTER))

    def largest_code(self, slot: int) -> int:
        return max(abs(code) for code in self.stored.codes[slot])

    def visit_shift(self, index: int, node: Shift) -> None:
        source, left = self.numbers[node.source], max(0, node.k)
        fraction = source.fraction + max(0, -node.k)
        exact = carried(source.exact << left, f'The value behind the shift "{node.label}"', SHORTER)
        self.numbers[index] = number(fraction, source.bound << left, exact) if left else replace(source, fraction=fraction)

    def visit_round(self, index: int, node: Round) -> None:
        assert node.quantizer is not None, "a program states every quantizer"
        source = self.numbers[node.source]
        drop = source.fraction - node.quantizer.word.fraction
        read = self.nodes[node.source]
        marked = isinstance(read, Sum) and read.grow is not None
        kept(node.quantizer.word, f'"{read.label}"', MARK if marked else PRE_SUM)
        self.check_rounding(node.label, source.bound, drop, node.quantizer)
        self.arithmetic[index] = RoundArithmetic(node.quantizer, drop, self.ordinal(drop))
        self.numbers[index] = word_number(node.quantizer.word)

    @staticmethod
    def check_rounding(label: str, bound: int, drop: int, quantizer: Quantizer) -> None:
        """A code that gains bits, and one that is dithered, are carried too."""
        if drop <= 0:
            carried(bound << -drop, f'What "{label}" puts into {quantizer.word}', SHORTER)
        elif quantizer.dither:
            carried(bound + (1 << drop), f'What "{label}" rounds, with its dither,', UNDITHERED)

    def ordinal(self, drop: int) -> int | None:
        return next(self.ordinals) if drop > 0 else None

    def stored_number(self, index: int) -> Number:
        """The number of what drives a delay, found without visiting it."""
        while isinstance(node := self.nodes[index], Delay):
            index = node.source
        if isinstance(node, Residue):
            return self.kept_residue(node)
        if isinstance(node, Input):
            return word_number(self.format.input.word)
        assert isinstance(node, Round) and node.quantizer is not None, "a delay stores what stands in a word"
        return word_number(node.quantizer.word)

    def residue_number(self, node: Residue) -> Number:
        register = self.nodes[node.source]
        if not isinstance(register, Round) or register.quantizer is None:
            return number(self.fraction(node.source), 0)
        fraction = self.fraction(register.source)
        bits = max(0, fraction - register.quantizer.word.fraction) + register.quantizer.dither
        # The magnitude stays below 2^bits: 63 bits and a sign still are one word.
        bound = carried(1 << bits, f'The residue "{node.label}"', SHORTER)
        return replace(number(fraction, bound), carrier=carrier_bits(bound - 1))

    def kept_residue(self, node: Residue) -> Number:
        """The number of a residue that a delay stores."""
        found = self.residue_number(node)
        integer = found.bound.bit_length() - found.fraction
        kept(Word(integer, found.fraction), f'The residue "{node.label}"', STORED_RESIDUE)
        return found

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
            arithmetic, bound = self.term(term, fraction, node.label)
            terms.append(arithmetic)
            total += bound
        accumulator = self.accumulator(index, fraction, total, exact=node.exact)
        self.arithmetic[index] = SumArithmetic(tuple(terms), accumulator, self.counted(index, accumulator))

    def term(self, term: Term, fraction: int, label: str) -> tuple[TermArithmetic, int]:
        """A term as it enters the accumulator of the sum `label`, and the largest magnitude that it brings."""
        source, shift = term.source, 0
        while isinstance(node := self.nodes[source], Shift):
            shift += node.k
            source = node.source
        rounding, keep = "floor", None
        bound, at = self.numbers[source].exact, self.numbers[source].fraction
        if isinstance(node, Gain):
            keep = min(at, fraction - max(0, -shift))
            if not self.widths.roles.residual[self.origins[source]] and not self.is_residual(node):
                rounding = self.format.product.rounding
                limit = self.format.product.fraction
                keep = keep if limit is None else min(keep, limit)
            bound = aligned(bound, keep - at)
            at = keep
        at += max(0, -shift)
        what = f'A term of the sum "{label}", at {fraction} fraction bits,'
        bound = carried(bound << max(0, shift), what, SHORTER_SUM)
        bound = carried(aligned(bound, fraction - at), what, SHORTER_SUM)
        return TermArithmetic(term.sign, source, shift, keep, rounding), bound

    def is_residual(self, gain: Gain) -> bool:
        return self.widths.roles.residual[self.origins[gain.source]]

    def accumulator(self, index: int, fraction: int, total: int, *, exact: bool) -> Accumulator:
        """Where a sum of that largest magnitude is made; fills in the sum's number."""
        carried(total, f'The exact sum "{self.nodes[index].label}"', SHORTER_SUM)
        word = None if exact else self.word_of_accumulator(fraction)
        carrier = carrier_bits(total)
        self.numbers[index] = (
            Number(fraction, total, total, carrier) if word is None
            else Number(fraction, min(total, -word.low), total, carrier_bits(0))
        )
        return Accumulator(fraction, word, self.format.accumulator.overflow, carrier)

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
        if node.stores and isinstance(read := self.nodes[node.source], Residue):
            self.kept_residue(read)
        word = Word(source.bound.bit_length() - source.fraction, source.fraction)
        pre, halved, operand, middle = self.operands(index, node, word)
        fraction = self.widths.raw(self.origins[index])
        keeps, ordinals, total = [], [], 0
        for i, slot in enumerate(node.coefficients):
            is_middle = i == len(node.coefficients) - 1 and node.fold == "even" and node.length % 2 == 1
            into, pre_drop, operand_drop = pre_operand(is_middle, pre, operand, middle, word, node.fold, halved)
            self.check_tap(node, source.bound, (pre, pre_drop), (middle if is_middle else operand, operand_drop), is_middle)
            product = into.fraction + self.stored.words[slot].fraction
            limit = self.format.product.fraction
            keep = min(product, fraction) if limit is None else min(product, fraction, limit)
            total += self.tap_bound(node.label, self.largest_code(slot) * -into.low, keep - product, halved, fraction - keep)
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

    def check_tap(
        self, node: Taps, bound: int, pre: tuple[Quantizer | None, int], operand: tuple[Quantizer | None, int],
        is_middle: bool,
    ) -> None:
        """FormatError where a pair's register or an operand, each with the bits that it drops, cannot be carried."""
        paired = node.fold is not None and not is_middle
        bound <<= paired
        for quantizer, drop in (pre, operand) if paired else (operand,):
            if quantizer is not None:
                kept(quantizer.word, f'What "{node.label}" multiplies', PRE_SUM)
                self.check_rounding(node.label, bound, drop, quantizer)
                bound = -quantizer.word.low

    @staticmethod
    def tap_bound(label: str, product: int, rounded: int, halved: int, left: int) -> int:
        """What a product of that magnitude brings into the sum: rounded, doubled where its pair was halved, aligned."""
        what = f'A product of "{label}"'
        doubled = aligned(carried(product, what, SHORTER), rounded) << halved
        return carried(aligned(carried(doubled, what, SHORTER), left), what, SHORTER)

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


def number(fraction: int, bound: int, exact: int | None = None) -> Number:
    """A value of either sign that stands in no word."""
    return Number(fraction, bound, bound if exact is None else exact, carrier_bits(bound))


def word_number(word: Word) -> Number:
    return Number(word.fraction, -word.low, -word.low, carrier_bits(0))


def aligned(bound: int, left: int) -> int:
    """The largest magnitude after a shift left, or right with a rounding."""
    return bound << left if left >= 0 else (bound >> -left) + 1
