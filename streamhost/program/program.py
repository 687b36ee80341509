"""A program: a diagram put into a format. Again a graph, with its roundings explicit, and beside each node the numbers.

The pass (lowering.py) decides everything; back ends, drawing, counts, noise and bounds read it here and know no rule.
"""

from dataclasses import dataclass
from functools import cached_property

from streamhost.diagram.diagram import Diagram
from streamhost.diagram.nodes import Delay, Node, Round, Taps
from streamhost.formats import Fixed, Float, Quantizer, Word
from streamhost.program.coefficients import Stored


@dataclass(frozen=True)
class Number:
    """What kind of number a node's value is: a code with `fraction` fraction bits, of magnitude at most `bound`.

    `exact`: the same had no accumulator overflowed. `carrier`: bits of the machine integer that holds the value, 64 or
    two such words; what stands in a word of 64 bits is as low as -2^63 and stays in one.
    """

    fraction: int
    bound: int
    exact: int
    carrier: int


@dataclass(frozen=True)
class TermArithmetic:
    """One term as it enters an accumulator.

    `source` is the gain or the value itself, `shift` the shifts between. A product is first rounded to `keep` fraction
    bits (None: the term is no product), shifted, then brought to the accumulator's fraction: left exactly, right by floor.
    """

    sign: int
    source: int
    shift: int = 0
    keep: int | None = None
    rounding: str = "floor"


@dataclass(frozen=True)
class Accumulator:
    """Where a sum is made: fraction bits, word (None: as long as needed), overflow, and the bits that carry it."""

    fraction: int
    word: Word | None
    overflow: str
    carrier: int


@dataclass(frozen=True)
class SumArithmetic:
    """A sum's terms and accumulator. `counted`: a sum that leaves its accumulator here, whose overflow is counted."""

    terms: tuple[TermArithmetic, ...]
    accumulator: Accumulator
    counted: bool


@dataclass(frozen=True)
class TapsArithmetic:
    """A tapped line: what is done to each operand, and where the products are summed.

    `pre`: the register of a pair's sum, after a shift right by `halved`; `operand`: what the multiplier reads, None
    where the word already holds it. `ordinals` holds (pre, operand) of each multiplication.
    """

    accumulator: Accumulator
    keeps: tuple[int, ...]
    rounding: str
    counted: bool
    pre: Quantizer | None
    halved: int
    operand: Quantizer | None
    middle: Quantizer | None
    ordinals: tuple[tuple[int | None, int | None], ...]


@dataclass(frozen=True)
class RoundArithmetic:
    """One rounding: its quantizer, the bits it drops (negative: gains), and its ordinal if it drops any."""

    quantizer: Quantizer
    drop: int
    ordinal: int | None


Arithmetic = SumArithmetic | TapsArithmetic | RoundArithmetic | None


@dataclass(frozen=True, eq=False)
class Program:
    """`drawn` is the diagram as the structure made it, `diagram` the same with explicit roundings and stored values.

    In fixed point `arithmetic` and `numbers` stand beside the nodes of `diagram`, and `stored` holds the codes; in floating
    point `types` does, and a Round is a conversion to the format's type.
    """

    drawn: Diagram
    diagram: Diagram
    format: Fixed | Float
    arithmetic: tuple[Arithmetic, ...] = ()
    numbers: tuple[Number, ...] = ()
    stored: Stored | None = None
    types: tuple[str, ...] = ()

    @cached_property
    def key(self) -> str:
        """Equal where a kernel and its state may be kept under new coefficients."""
        import hashlib

        words = self.stored.words if self.stored else ()
        carriers = [(number.fraction, number.carrier) for number in self.numbers]
        text = repr((self.diagram.nodes, self.arithmetic, carriers, words, self.types, self.format))
        return hashlib.sha256(text.encode()).hexdigest()

    @property
    def nodes(self) -> tuple[Node, ...]:
        return self.diagram.nodes

    @cached_property
    def roundings(self) -> tuple[int, ...]:
        """The nodes at which a register is made, in evaluation order."""
        return tuple(i for i in self.diagram.order if isinstance(self.nodes[i], Round))

    @cached_property
    def counted_sums(self) -> tuple[int, ...]:
        """Sums and taps that leave their accumulator and may overflow it."""
        found = []
        for index in self.diagram.order:
            arithmetic = self.arithmetic[index] if self.arithmetic else None
            if isinstance(arithmetic, SumArithmetic | TapsArithmetic) and arithmetic.counted:
                found.append(index)
        return tuple(found)

    @cached_property
    def state_words(self) -> int:
        """Words of state per channel."""
        return sum(node.stores for node in self.nodes)

    @cached_property
    def state_offsets(self) -> dict[int, int]:
        """Where the words of each storing node begin: oldest reading is found by the frame counter for lines longer than 1."""
        offsets, offset = {}, 0
        for index, node in enumerate(self.nodes):
            if isinstance(node, Delay | Taps):
                offsets[index] = offset
                offset += node.stores
        return offsets

    @cached_property
    def quantizers(self) -> tuple[Quantizer, ...]:
        """Every quantizer that stands in the program."""
        found: list[Quantizer] = []
        for arithmetic in self.arithmetic:
            if isinstance(arithmetic, RoundArithmetic):
                found.append(arithmetic.quantizer)
            if isinstance(arithmetic, TapsArithmetic):
                found.extend(q for q in (arithmetic.pre, arithmetic.operand, arithmetic.middle) if q is not None)
        return tuple(found)

    @cached_property
    def ordinals(self) -> int:
        """How many quantizations drop bits; the input's, ordinal 0, is not among them."""
        found = 0
        for arithmetic in self.arithmetic:
            if isinstance(arithmetic, RoundArithmetic):
                found += arithmetic.ordinal is not None
            if isinstance(arithmetic, TapsArithmetic):
                found += sum(ordinal is not None for pair in arithmetic.ordinals for ordinal in pair)
        return found
