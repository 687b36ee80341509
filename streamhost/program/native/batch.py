"""Printing a fixed-point part as a kernel of its own, many states side by side: the lanes of a batch.

The statements are those of the plain kernel. Where all values fit one word of 64 bits a variable is a vector of lanes, else
one integer, and the lanes follow each other. An input is constant over the frames, one code a lane. A watching kernel
compares every frame's state with a reference, and notes until it comes back: the frames that it took, the largest
and smallest value of the watched nodes, and whether anything overflowed.
"""

from collections.abc import Sequence

from streamhost.diagram.nodes import Delay, Gain, Input, Output
from streamhost.formats import Quantizer
from streamhost.program.native.fixed import FixedPrinter
from streamhost.program.native.frame import Variant, close_text, open_text
from streamhost.program.native.text import Value, overflowed_text
from streamhost.program.program import Program

WIDTH = 16
"""Lanes of a vector: several machine vectors, so that one does not wait for the other."""

WATCHING = '''
def raised(before, value, period):
    return max(before, value) if period == 0 else before


def sunk(before, value, period):
    return min(before, value) if period == 0 else before


def noted(before, bits, period):
    return (before | bits) if period == 0 else before


def returned(period, difference, frames):
    return frames if (period | difference) == 0 else period
'''
TWO_WORDS = ("wide(", "narrow(", "clamp(", "differs(")
MOST_SHIFTED = 1 << 62


def print_batch(program: Program, watched: Sequence[int] | None) -> str:
    """The source of a batch kernel; watching where nodes are given, if none of them.

    Rows of what it finds: the period (0: none yet), bits that were lost by overflow, then high and low of each node.
    """
    text = BatchPrinter(program, watched, vector=True).source()
    if any(word in text for word in TWO_WORDS):
        return BatchPrinter(program, watched, vector=False).source()
    return text


class StepPrinter(FixedPrinter):
    """Statements that take the states s{node} one frame on; without labels, so that like parts are one text."""

    def __init__(self, program: Program, *, watching: bool, vector: bool) -> None:
        super().__init__(program, Variant(codes=True, metered=watching))
        self.vector = vector
        self.traced = {}
        self.lost: list[str] = []
        self.states = [index for index, node in enumerate(self.nodes) if isinstance(node, Delay)]

    def head(self, functions: str = "", width: int = 1) -> None:
        title = f"{self.format.label}: a batch of nodes {len(self.nodes)}, states {len(self.states)}."
        open_text(self.text, title, functions, width)

    def load_coefficients(self, lane: str) -> None:
        for slot in sorted({node.coefficient for node in self.nodes if isinstance(node, Gain)}):
            self.text(f"k{slot} = C[{slot}, {lane}]")

    def step(self) -> None:
        """All statements of a frame, and the new states."""
        for index in self.program.diagram.order:
            self.print(index, self.nodes[index])
        self.store()

    def assign(self, index: int, value: Value, *, prefix: str = "v") -> Value:
        self.text(f"{prefix}{index} = {value.text}")
        named = Value(f"{prefix}{index}", value.bound, is_wide=value.is_wide, is_short=value.is_short)
        if prefix == "v":
            self.values[index] = named
        return named

    def rounded(self, name: str, source: Value, quantizer: Quantizer, drop: int, ordinal: int | None) -> Value:
        """As the plain kernel has it, in fewer machine instructions where half a step more is carried."""
        addends = {"floor": 0, "half-up": 1 << max(0, drop - 1)}
        rounding = quantizer.rounding
        if not self.vector or not 0 < drop < 62 or rounding not in addends or source.bound + addends[rounding] >= MOST_SHIFTED:
            return super().rounded(name, source, quantizer, drop, ordinal)
        # made positive first, as not every machine shifts signs in vectors
        lifted = f"np.uint64({source.text} + {addends[rounding] + MOST_SHIFTED}) >> np.uint64({drop})"
        self.text(f"q{name} = np.int64({lifted}) - {MOST_SHIFTED >> drop}")
        return Value(f"q{name}", (source.bound >> drop) + 1, is_wide=False)

    def print_input(self, index: int) -> None:
        self.values[index] = self.value_of(f"u{index}", index)

    def print_output(self, index: int, node: Output) -> None:
        self.values[index] = self.values[node.source]

    def store(self) -> None:
        for index in self.states:
            value = self.values[self.nodes[index].reads[0]].text
            self.text(f"s{index} = {value}")

    def overflow(self, index: int, code: Value, quantizer: Quantizer, meter: int, name: str | None = None) -> Value:
        target = name or f"v{index}"
        self.text(f"{target} = {overflowed_text(code, quantizer.word, quantizer.overflow)}")
        if self.variant.metered:
            self.lost.append(f"differs({code.text}, wide({target}))" if code.is_wide else f"({code.text} ^ {target})")
        value = Value(target, -quantizer.word.low, is_wide=False, is_short=quantizer.word.bits <= 32)
        if name is None:
            self.values[index] = value
        return value

    def count_overflow(self, index: int) -> None:
        exact, value = self.exact[index], self.values[index]
        two = exact.is_wide or value.is_wide
        self.lost.append(f"differs({exact.wide().text}, {value.wide().text})" if two else f"({exact.text} ^ {value.text})")


class BatchPrinter(StepPrinter):
    """The whole batch kernel."""

    def __init__(self, program: Program, watched: Sequence[int] | None, *, vector: bool) -> None:
        super().__init__(program, watching=watched is not None, vector=vector)
        self.watched = watched

    def source(self) -> str:
        watching = self.watched is not None
        self.head(WATCHING.strip() if watching else "", WIDTH if self.vector else 1)
        text, rows = self.text, max(1, len(self.states))
        text(f"S = carray(state_, ({rows}, channels), np.int64)")
        text("U = carray(x_, (1, channels), np.int64)")
        text(f"C = carray(coefficients_, ({max(1, len(self.program.diagram.slots))}, channels), np.int64)")
        if self.watched is not None:
            text(f"R = carray(y_, ({rows}, channels), np.int64)")
            text(f"P = carray(keys_, ({found_rows(self.watched)}, channels), np.int64)")
        text("for c in range(channels):")
        with text.indented():
            self.load_coefficients("c")  # alike in all lanes, and in vectors as what they are multiplied with
            self.print_lane()
        text.depth = 0
        close_text(text)
        return str(text)

    def print_lane(self) -> None:
        text, kept = self.text, [(f"s{index}", "S", row) for row, index in enumerate(self.states)]
        for index, node in enumerate(self.nodes):
            if isinstance(node, Input):
                self.load(f"u{index}", "U", 0)
        for name, array, row in kept:
            self.load(name, array, row)
        watched = [] if self.watched is None else self.print_watch()
        for name, array, row in watched:
            self.load(name, array, row)
        text("for n in range(frames):")
        with text.indented():
            self.step()
            if self.watched is not None:
                self.print_watching()
        for name, array, row in (*kept, *watched):
            text(f"{array}[{row}, c] = {name}")

    def load(self, name: str, array: str, row: int) -> None:
        self.text(f"{name} = {array}[{row}, c]")

    def print_watch(self) -> list[tuple[str, str, int]]:
        """Loads the reference; what is watched, as (variable, array, row)."""
        assert self.watched is not None, "nodes are watched"
        for row, index in enumerate(self.states):
            self.load(f"r{index}_", "R", row)
        names = [("period", "P", 0), ("lost", "P", 1)]
        for k in range(len(self.watched)):
            names += [(f"high{k}", "P", 2 + 2 * k), (f"low{k}", "P", 3 + 2 * k)]
        return names

    def print_watching(self) -> None:
        assert self.watched is not None, "nodes are watched"
        for k, index in enumerate(self.watched):
            self.text(f"high{k} = raised(high{k}, {self.values[index].text}, period)")
            self.text(f"low{k} = sunk(low{k}, {self.values[index].text}, period)")
        if self.lost:
            self.text(f"lost = noted(lost, {' | '.join(self.lost)}, period)")
        differs = " | ".join(f"(s{index} ^ r{index}_)" for index in self.states)
        self.text(f"period = returned(period, {differs or '0'}, frame0 + n + 1)")


def found_rows(watched: Sequence[int]) -> int:
    return 2 + 2 * len(watched)
