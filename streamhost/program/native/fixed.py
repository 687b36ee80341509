"""Printing a fixed-point program as a kernel's source: one statement a node, in evaluation order."""

from streamhost.diagram.nodes import Delay, Gain, Input, Node, Output, Residue, Round, Shift, Sum, Taps
from streamhost.formats import Fixed, Quantizer
from streamhost.program.native.doors import input_text
from streamhost.program.native.frame import Variant, close_loops, has_dither, header, lines, open_loops
from streamhost.program.native.meters import meter_places
from streamhost.program.native.taps import print_taps
from streamhost.program.native.text import SHORT, Text, Value, comment, overflowed_text, rounded_text
from streamhost.program.program import Program, RoundArithmetic, SumArithmetic, TapsArithmetic, TermArithmetic
from streamhost.program.sources import traced_roundings

DITHER = """
def dither_word(key, step):
    z = key + np.uint64(0x9E3779B97F4A7C15) * step
    z ^= z >> np.uint64(30)
    z *= np.uint64(0xBF58476D1CE4E5B9)
    z ^= z >> np.uint64(27)
    z *= np.uint64(0x94D049BB133111EB)
    return z ^ (z >> np.uint64(31))
"""


def print_fixed(program: Program, variant: Variant) -> str:
    """The source of a fixed-point kernel."""
    return FixedPrinter(program, variant).source()


class FixedPrinter:
    """Prints node after node; `values` holds what each node's variable is."""

    def __init__(self, program: Program, variant: Variant) -> None:
        assert isinstance(program.format, Fixed), "a fixed-point program"
        self.program, self.variant, self.format = program, variant, program.format
        self.nodes = program.nodes
        self.text = Text()
        self.values: dict[int, Value] = {}
        self.exact: dict[int, Value] = {}
        self.flags: list[str] = []
        self.in_loop = False
        self.meters = meter_places(program)
        self.traced = {index: k for k, index in enumerate(traced_roundings(program))}

    def source(self) -> str:
        functions = DITHER.strip() if has_dither(self.program) else ""
        title = f"{self.format.label}: nodes {len(self.nodes)}, roundings {len(self.program.roundings)}."
        header(self.text, self.program, self.variant, functions, "int64", title)
        open_loops(self.text, self.program, self.variant, "{}")
        if self.variant.metered and any(isinstance(node, Taps) for node in self.nodes):
            self.text("o = np.int64(0)")
            self.flags.append("o")
        if has_dither(self.program):
            self.text("t = np.uint64(2) * np.uint64(frame0 + n) + np.uint64(1)")
        for index in self.program.diagram.order:
            self.print(index, self.nodes[index])
        if self.variant.metered and self.flags:
            self.text(f"F[n, c] = np.uint8(({' | '.join(self.flags)}) != 0)")
        self.store()
        close_loops(self.text, self.program, self.variant)
        return str(self.text)

    def assign(self, index: int, value: Value, *, prefix: str = "v") -> Value:
        """A statement that gives a node's value a name."""
        self.text(f"{prefix}{index} = {value.text}{comment(self.nodes[index].label)}")
        named = Value(f"{prefix}{index}", value.bound, is_wide=value.is_wide, is_short=value.is_short)
        if prefix == "v":
            self.values[index] = named
        return named

    def print(self, index: int, node: Node) -> None:
        arithmetic = self.program.arithmetic[index]
        if isinstance(node, Input):
            self.print_input(index)
        elif isinstance(node, Delay):
            self.print_delay(index, node)
        elif isinstance(node, Gain):
            self.assign(index, self.coefficient(f"k{node.coefficient}", node.coefficient).times(self.values[node.source]))
        elif isinstance(node, Shift):
            self.values[index] = self.values[node.source].left(max(0, node.k))
            if node.source in self.exact:
                self.exact[index] = self.exact[node.source].left(max(0, node.k))
        elif isinstance(node, Sum):
            assert isinstance(arithmetic, SumArithmetic), "a sum has its arithmetic"
            self.print_sum(index, arithmetic)
        elif isinstance(node, Taps):
            assert isinstance(arithmetic, TapsArithmetic), "a tapped line has its arithmetic"
            print_taps(self, index, node, arithmetic)
        elif isinstance(node, Round):
            assert isinstance(arithmetic, RoundArithmetic), "a rounding has its arithmetic"
            self.print_round(index, node, arithmetic)
        elif isinstance(node, Residue):
            rest = f"r{node.source}" if self.has_residue(node.source) else "np.int64(0)"
            self.values[index] = self.value_of(rest, index)
        elif isinstance(node, Output):
            self.print_output(index, node)

    def value_of(self, text: str, index: int) -> Value:
        """An expression that holds a node's value, in as many words as that takes."""
        number = self.program.numbers[index]
        stands_in_word = isinstance(self.nodes[index], Input | Delay | Round)
        return Value(text, number.bound, is_wide=number.carrier > 64, is_short=stands_in_word and number.bound <= SHORT)

    def coefficient(self, text: str, slot: int) -> Value:
        assert self.program.stored is not None, "a fixed-point program"
        return Value(text, self.largest(slot), is_wide=False, is_short=self.program.stored.words[slot].bits <= 32)

    def largest(self, slot: int) -> int:
        """The largest magnitude of a coefficient's word: kernels serve every value that fits it and its bound."""
        assert self.program.stored is not None, "a fixed-point program"
        return max(abs(code) for code in self.program.stored.codes[slot])

    # doors

    def print_input(self, index: int) -> None:
        if self.variant.codes:
            self.text(f"v{index} = x[n, c]")
        else:
            input_text(self.text, f"v{index}", self.format.input, metered=self.variant.metered)
        self.values[index] = self.value_of(f"v{index}", index)

    def print_output(self, index: int, node: Output) -> None:
        value, at = self.values[node.source], self.program.numbers[node.source].fraction
        place = self.program.diagram.outputs.index(index)
        target = f"y[n, {place} * channels + c]" if place else "y[n, c]"
        if self.variant.codes:
            left = self.format.output.word.fraction - at
            self.text(f"{target} = {f'({value.text} << {left})' if left else value.text}")
        else:
            assert self.format.output.word.bits <= 53, "longer words go out as codes"
            self.text(f"{target} = np.float64({value.text}) * {float(2.0**-at)!r}")

    # memory

    def print_delay(self, index: int, node: Delay) -> None:
        place = f"s{index}" if node.n == 1 else f"S[{self.program.state_offsets[index]} + p{index}, c]"
        self.assign(index, self.value_of(place, index))

    def store(self) -> None:
        single, rings = lines(self.program)
        for index in single:
            self.text(f"s{index} = {self.values[self.nodes[index].reads[0]].text}")
        for index in rings:
            place = f"S[{self.program.state_offsets[index]} + p{index}, c]"
            self.text(f"{place} = {self.values[self.nodes[index].reads[0]].text}")

    # sums

    def print_sum(self, index: int, arithmetic: SumArithmetic) -> None:
        accumulator = arithmetic.accumulator
        word = accumulator.word
        if word is None:
            terms = [(t.sign, self.term(t, accumulator.fraction, self.values)) for t in arithmetic.terms]
            self.assign(index, self.added(terms))
            return
        shadow = self.variant.metered
        if shadow:
            exact = self.assign(
                index,
                self.added([(t.sign, self.term(t, accumulator.fraction, self.exact)) for t in arithmetic.terms]),
                prefix="e",
            )
            self.exact[index] = exact
        if accumulator.overflow == "saturate":
            self.print_saturating_sum(index, arithmetic)
        elif shadow and not any(t.source in self.exact for t in arithmetic.terms):
            self.assign(index, self.value_of(overflowed_text(self.exact[index], word, "wrap"), index))
        else:
            terms = [(t.sign, self.modular(self.term(t, accumulator.fraction, self.values))) for t in arithmetic.terms]
            total = Value(f"w{index}", 0)
            self.text(f"w{index} = {joined(terms)}")
            self.assign(index, self.value_of(overflowed_text(total, word, "wrap"), index))
        if shadow and arithmetic.counted:
            self.count_overflow(index)

    def count_overflow(self, index: int) -> None:
        exact, value = self.exact[index], self.values[index]
        if exact.is_wide or value.is_wide:
            text = f"differs({exact.wide().text}, {value.wide().text})"
        else:
            text = f"np.int64({exact.text} != {value.text})"
        self.count(self.meters[index], text)

    def count(self, meter: int, text: str) -> None:
        """Count an event of this frame; inside the loop of a tapped line the flag is summed up there."""
        if self.in_loop:
            self.text(f"h = {text}")
            self.text(f"m{meter} += h")
            self.text("o += h")
            return
        name = f"h{len(self.flags)}"
        self.text(f"{name} = {text}")
        self.text(f"m{meter} += {name}")
        self.flags.append(name)

    @staticmethod
    def modular(value: Value) -> Value:
        """A term of a sum that wraps at 64 bits or fewer: only its low 64 bits count."""
        return Value(f"narrow({value.text})", 0, is_wide=False) if value.is_wide else Value(value.text, 0)

    @staticmethod
    def added(terms: list[tuple[int, Value]]) -> Value:
        sign, total = terms[0]
        if sign < 0:
            total = Value("np.int64(0)", 0).plus(-1, total)
        for sign, term in terms[1:]:
            total = total.plus(sign, term)
        return total

    def print_saturating_sum(self, index: int, arithmetic: SumArithmetic) -> None:
        word = arithmetic.accumulator.word
        assert word is not None, "saturation has a word"
        total = Value("np.int64(0)", 0)
        for k, term in enumerate(arithmetic.terms):
            value = self.term(term, arithmetic.accumulator.fraction, self.values)
            self.text(f"u{index}_{k} = {value.text}")
            named = Value(f"u{index}_{k}", value.bound, is_wide=value.is_wide)
            limited = Value(overflowed_text(named, word, "saturate"), -word.low, is_wide=False)
            running = total.plus(term.sign, limited)
            self.text(f"w{index}_{k} = {running.text}")
            running = Value(f"w{index}_{k}", running.bound, is_wide=running.is_wide)
            self.text(f"a{index}_{k} = {overflowed_text(running, word, 'saturate')}")
            total = Value(f"a{index}_{k}", -word.low, is_wide=False)
        self.assign(index, self.value_of(total.text, index))

    def term(self, term: TermArithmetic, fraction: int, values: dict[int, Value]) -> Value:
        """A term in the accumulator's fraction; `values` may hold shadows, else the node's own value is read."""
        value = values.get(term.source, self.values[term.source])
        at = self.program.numbers[term.source].fraction
        if term.keep is not None and term.keep < at:
            value, at = rounded_text(value, at - term.keep, term.rounding), term.keep
        value = value.left(max(0, term.shift))
        return value.floored(at + max(0, -term.shift) - fraction)

    # registers

    def has_residue(self, index: int) -> bool:
        arithmetic = self.program.arithmetic[index]
        return isinstance(arithmetic, RoundArithmetic) and arithmetic.drop > 0

    def print_round(self, index: int, node: Round, arithmetic: RoundArithmetic) -> None:
        source = self.values[node.source]
        code = self.rounded(f"{index}", source, arithmetic.quantizer, arithmetic.drop, arithmetic.ordinal)
        asked = index in self.traced or any(
            isinstance(self.nodes[r], Residue) for r in self.program.diagram.readers[index]
        )
        if asked and arithmetic.drop > 0:
            self.print_residue(index, source, code, arithmetic)
        self.overflow(index, code, arithmetic.quantizer, self.meters[index])

    def print_residue(self, index: int, source: Value, code: Value, arithmetic: RoundArithmetic) -> None:
        """r{index}: what a rounding drops. A trace holds its leading 62 bits, which is all of most."""
        drop, bits = arithmetic.drop, arithmetic.drop + arithmetic.quantizer.dither
        if bits < 64:
            before, after = self.modular(source), self.modular(code)
        else:
            before, after = source.wide(), code.wide()
        self.text(f"r{index} = {before.text} - ({after.text} << {drop})")
        if self.variant.traced and index in self.traced:
            rest, cut = (f"r{index}", 0) if bits < 64 else (f"narrow(r{index} >> {bits - 62})", bits - 62)
            self.text(f"R[n, c, {self.traced[index]}] = np.float64({rest}) * {2.0**(cut - drop)!r}")

    def rounded(self, name: str, source: Value, quantizer: Quantizer, drop: int, ordinal: int | None) -> Value:
        """A variable with the rounded code, dithered where the quantizer says so."""
        if quantizer.dither and ordinal is not None:
            self.print_dither(name, str(ordinal - 1), drop)
            source = source.plus(1, Value(f"d{name}", 1 << drop, is_wide=drop > 63))
            self.text(f"x{name} = {source.text}")
            source = Value(f"x{name}", source.bound, is_wide=source.is_wide)
        code = rounded_text(source, drop, quantizer.rounding)
        self.text(f"q{name} = {code.text}")
        return Value(f"q{name}", code.bound, is_wide=code.is_wide)

    def print_dither(self, name: str, place: str, drop: int) -> None:
        """d{name}: the triangular dither of a rounding that drops so many bits; `place` is its row of keys."""
        first, second = (f"dither_word(K[{place}, c], {step})" for step in ("t", "t + np.uint64(1)"))
        if drop < 64:
            first, second = (f"np.int64({word} >> np.uint64({64 - drop}))" for word in (first, second))
            self.text(f"d{name} = {first} - {second}")
            return
        # The difference of two words of 64 bits has 65: that of their halves, doubled, and that of their last bits.
        self.text(f"i{name} = {first}")
        self.text(f"j{name} = {second}")
        halves = " - ".join(f"np.int64({each}{name} >> np.uint64(1))" for each in "ij")
        bits = " - ".join(f"np.int64({each}{name} & np.uint64(1))" for each in "ij")
        self.text(f"d{name} = ((wide({halves}) << 1) + wide({bits})) << {drop - 64}")

    def overflow(self, index: int, code: Value, quantizer: Quantizer, meter: int, name: str | None = None) -> Value:
        """The code brought into its word, counted where it did not fit."""
        target = name or f"v{index}"
        self.text(f"{target} = {overflowed_text(code, quantizer.word, quantizer.overflow)}")
        value = Value(target, -quantizer.word.low, is_wide=False, is_short=quantizer.word.bits <= 32)
        if self.variant.metered:
            differs = f"differs({code.text}, wide({target}))" if code.is_wide else f"np.int64({code.text} != {target})"
            self.count(meter, differs)
        if name is None:
            self.values[index] = value
        return value


def joined(terms: list[tuple[int, Value]]) -> str:
    """Signed 64-bit terms as one expression, added left to right modulo 2^64."""
    sign, first = terms[0]
    text = first.text if sign > 0 else f"(0 - {first.text})"
    for sign, term in terms[1:]:
        text = f"({text} {'+' if sign > 0 else '-'} {term.text})"
    return text
