"""Printing a tapped delay line in fixed point: one loop where all taps are treated alike, else one block a tap."""

from typing import TYPE_CHECKING

from streamhost.diagram.nodes import Taps
from streamhost.formats import Quantizer
from streamhost.program.native.text import Value, overflowed_text, rounded_text
from streamhost.program.program import TapsArithmetic

if TYPE_CHECKING:
    from streamhost.program.native.fixed import FixedPrinter


def print_taps(printer: "FixedPrinter", index: int, node: Taps, arithmetic: TapsArithmetic) -> None:
    """The weighted sum of a line; v{index} is its value, e{index} the same without overflow where that is asked for."""
    TapsPrinter(printer, index, node, arithmetic).print()


class TapsPrinter:
    """Prints the multiplications of one tapped line in their order."""

    def __init__(self, printer: "FixedPrinter", index: int, node: Taps, arithmetic: TapsArithmetic) -> None:
        self.printer, self.text = printer, printer.text
        self.index, self.node, self.arithmetic = index, node, arithmetic
        program = printer.program
        assert program.stored is not None, "a fixed-point program"
        self.words = [program.stored.words[slot] for slot in node.coefficients]
        self.at = program.numbers[node.source].fraction
        self.largest = max(printer.largest(slot) for slot in node.coefficients)
        accumulator = arithmetic.accumulator
        self.shadow = printer.variant.metered and accumulator.word is not None

    def print(self) -> None:
        i, word = self.index, self.arithmetic.accumulator.word
        zero = Value("np.int64(0)", 0).as_wide_as(self.total_wide).text
        self.text(f"a{i} = {zero}")
        if self.shadow:
            self.text(f"e{i} = {Value('np.int64(0)', 0).as_wide_as(self.exact_wide).text}")
        self.printer.in_loop = True
        self.print_line()
        self.printer.in_loop = False
        number = self.printer.program.numbers[i]
        total = Value(f"a{i}", number.bound, is_wide=self.total_wide)
        if word is not None and self.arithmetic.accumulator.overflow == "wrap":
            total = self.printer.value_of(overflowed_text(Value(f"a{i}", 0), word, "wrap"), i)
        self.printer.assign(i, total)
        if self.shadow:
            self.printer.exact[i] = Value(f"e{i}", number.exact, is_wide=self.exact_wide)
            if self.arithmetic.counted:
                self.printer.count_overflow(i)

    @property
    def exact_wide(self) -> bool:
        return self.arithmetic.accumulator.carrier == 128

    @property
    def total_wide(self) -> bool:
        return self.exact_wide and self.arithmetic.accumulator.word is None

    def print_line(self) -> None:
        count = len(self.node.coefficients)
        middle = self.node.fold == "even" and self.node.length % 2 == 1
        regular = count - middle
        alike = len({*zip(self.words[:regular], self.arithmetic.keeps[:regular], strict=True)}) <= 1
        if regular and alike:
            self.text(f"for j in range({regular}):")
            with self.text.indented():
                self.print_tap("j", 0, is_middle=False)
        else:
            for k in range(regular):
                self.print_tap(str(k), k, is_middle=False)
        if middle:
            self.print_tap(str(count - 1), count - 1, is_middle=True)

    def entry(self, j: str) -> str:
        """The sample j frames back: the newest from its variable, others from the ring."""
        now = self.printer.values[self.node.source].text
        words = self.node.stores
        if words == 0 or j == "0":
            return now
        offset, p = self.printer.program.state_offsets[self.index], f"p{self.index}"
        place = f"{offset} + ({p} - {j} if {p} >= {j} else {p} - {j} + {words})"
        return f"S[{place}, c]" if j.isdigit() else f"({now} if {j} == 0 else S[{place}, c])"

    def opposite(self, j: str) -> str:
        """The tap as far from the other end."""
        last = self.node.length - 1
        return str(last - int(j)) if j.isdigit() else f"({last} - {j})"

    def print_tap(self, j: str, k: int, *, is_middle: bool) -> None:
        i = self.index
        self.text(f"f{i} = {self.entry(self.opposite(j) if self.node.last_first else j)}")
        value, at, halved = self.printer.value_of(f"f{i}", self.node.source), self.at, 0
        ordinals = self.arithmetic.ordinals[k]
        if self.node.fold is None or is_middle:
            operand = self.arithmetic.middle if is_middle else self.arithmetic.operand
        else:
            operand, halved = self.arithmetic.operand, self.arithmetic.halved
            self.text(f"g{i} = {self.entry(self.opposite(j))}")
            other = self.printer.value_of(f"g{i}", self.node.source)
            value = value.plus(1 if self.node.fold == "even" else -1, other)
            at += halved
            if self.arithmetic.pre is not None:
                value, at = self.quantized(f"{i}p", value, at, self.arithmetic.pre, ordinals[0], j, k)
        if operand is not None:
            value, at = self.quantized(f"{i}o", value, at, operand, ordinals[1], j, k)
        self.print_product(j, k, value, at, halved)

    def quantized(
        self, name: str, value: Value, at: int, quantizer: Quantizer, ordinal: int | None, j: str, k: int
    ) -> tuple[Value, int]:
        """An operand after a quantizer; its dither key moves on with the tap."""
        self.text(f"b{name} = {value.text}")
        source = Value(f"b{name}", value.bound, is_wide=value.is_wide)
        drop = at - quantizer.word.fraction
        if quantizer.dither and ordinal is not None:
            step = self.ordinal_step()
            place = str(ordinal - 1) if j.isdigit() else f"{ordinal - 1} + {j} * {step}"
            self.printer.print_dither(name, place, drop)
            source = source.plus(1, Value(f"d{name}", 1 << drop, is_wide=drop > 63))
            self.text(f"x{name} = {source.text}")
            source = Value(f"x{name}", source.bound, is_wide=source.is_wide)
        code = rounded_text(source, drop, quantizer.rounding)
        self.text(f"q{name} = {code.text}")
        code = Value(f"q{name}", code.bound, is_wide=code.is_wide)
        meter = self.printer.meters[-1 - self.index]
        return self.printer.overflow(self.index, code, quantizer, meter, f"c{name}"), quantizer.word.fraction

    def ordinal_step(self) -> int:
        """Ordinals per multiplication of the loop."""
        return sum(ordinal is not None for ordinal in self.arithmetic.ordinals[0])

    def print_product(self, j: str, k: int, value: Value, at: int, halved: int) -> None:
        i, accumulator = self.index, self.arithmetic.accumulator
        first = self.node.coefficients[0]
        short = all(word.bits <= 32 for word in self.words)
        coefficient = Value(f"C[{first} + {j}, c]", self.largest, is_wide=False, is_short=short)
        product = coefficient.times(value)
        at += self.words[k].fraction
        keep = min(self.arithmetic.keeps[k], at)
        if keep < at:
            self.text(f"h{i}p = {product.text}")
            product = rounded_text(
                Value(f"h{i}p", product.bound, is_wide=product.is_wide), at - keep, self.arithmetic.rounding
            )
        term = product.left(halved).floored(keep - accumulator.fraction).as_short_as_it_fits()
        if self.shadow:
            self.text(f"l{i} = {term.as_wide_as(self.exact_wide or term.is_wide).text}")
            term = Value(f"l{i}", term.bound, is_wide=self.exact_wide or term.is_wide)
            exact = term.as_wide_as(self.exact_wide).text
            self.text(f"e{i} = e{i} + {exact}")
        self.accumulate(term)

    def accumulate(self, term: Value) -> None:
        i, accumulator = self.index, self.arithmetic.accumulator
        if accumulator.word is None:
            self.text(f"a{i} = a{i} + {term.as_wide_as(self.total_wide).text}")
        elif accumulator.overflow == "wrap":
            self.text(f"a{i} = a{i} + {self.printer.modular(term).text}")
        else:
            self.text(f"t{i} = {term.text}")
            named = Value(f"t{i}", term.bound, is_wide=term.is_wide)
            limited = Value(overflowed_text(named, accumulator.word, "saturate"), -accumulator.word.low, is_wide=False)
            running = Value(f"a{i}", -accumulator.word.low, is_wide=False).plus(1, limited)
            self.text(f"b{i} = {running.text}")
            running = Value(f"b{i}", running.bound, is_wide=running.is_wide)
            self.text(f"a{i} = {overflowed_text(running, accumulator.word, 'saturate')}")
