"""Where values meet words: registers, accumulators, and the operands of tapped lines."""

from collections.abc import Iterator
from dataclasses import dataclass

from streamhost.diagram.nodes import Round, Taps
from streamhost.formats import Word
from streamhost.measure.naming import rounding_name
from streamhost.program.native.meters import meter_places
from streamhost.program.program import Program, RoundArithmetic, SumArithmetic, TapsArithmetic


@dataclass(frozen=True)
class Place:
    """`parts`: nodes and factors whose magnitudes together bound the value; one alone and 1.0 is the value itself.

    node: the value in question, or what drives it. step: of the word. meter: its counter in a metered kernel.
    """

    name: str
    kind: str
    node: int
    parts: tuple[tuple[int, float], ...]
    word: Word
    on_overflow: str
    meter: int

    @property
    def step(self) -> float:
        return float(2.0**-self.word.fraction)

    @property
    def largest(self) -> float:
        return float(-self.word.low * self.step)


def places(program: Program) -> tuple[Place, ...]:
    """All of a fixed-point program, in evaluation order."""
    return tuple(place for index in program.diagram.order for place in _at(program, index))


def _at(program: Program, index: int) -> Iterator[Place]:
    arithmetic, meters, node = program.arithmetic[index], meter_places(program), program.nodes[index]
    if isinstance(arithmetic, RoundArithmetic):
        assert isinstance(node, Round), "a rounding has a Round"
        quantizer = arithmetic.quantizer
        yield Place(rounding_name(program, index), "register", index, ((index, 1.0),), quantizer.word, quantizer.overflow,
                    meters[index])
    if isinstance(arithmetic, TapsArithmetic):
        assert isinstance(node, Taps), "a tapped line"
        yield from _operands(node, index, arithmetic, meters[-1 - index])
    if isinstance(arithmetic, SumArithmetic | TapsArithmetic) and arithmetic.counted:
        accumulator = arithmetic.accumulator
        assert accumulator.word is not None, "only a stated accumulator overflows"
        yield Place(f"the accumulator of {node.label}", "accumulator", index, _parts(program, index, accumulator.overflow),
                    accumulator.word, accumulator.overflow, meters[index])


def _parts(program: Program, index: int, overflow: str) -> tuple[tuple[int, float], ...]:
    """A sum that wraps on the way is right where its end is in range; one that saturates must be in range at every term."""
    if overflow == "wrap":
        return ((index, 1.0),)
    node, arithmetic = program.nodes[index], program.arithmetic[index]
    if isinstance(node, Taps):
        weights = abs(program.diagram.values[list(node.coefficients)]).sum(axis=0).max()
        return ((node.source, float(weights) * (1.0 if node.fold is None else 2.0)),)
    assert isinstance(arithmetic, SumArithmetic), "a sum or a tapped line"
    return tuple((term.source, float(2.0**term.shift)) for term in arithmetic.terms)


def _operands(node: Taps, index: int, arithmetic: TapsArithmetic, meter: int) -> Iterator[Place]:
    """The words that a tapped line's multiplications read, of which none can be told from another."""
    paired = 1.0 if node.fold is None else 2.0 ** (1 - arithmetic.halved)
    for quantizer, factor in ((arithmetic.pre, paired), (arithmetic.operand, paired), (arithmetic.middle, 1.0)):
        if quantizer is not None:
            yield Place(f"the operands of {node.label}", "operand", index, ((node.source, factor),), quantizer.word,
                        quantizer.overflow, meter)
