"""What a program does for each frame and channel: its operations one by one, and how many there are of each.

Counted on the program, that is with every rounding explicit, for a machine that keeps what is between two nodes in registers:

* multiplication: a stored coefficient times a value, whatever the coefficient's value; what folded taps share is one.
* addition: of two terms; a sum of n terms has n - 1. Pre-sums of folded taps are among them, and so is the subtraction by
  which a residue is found.
* shift: a term that has another binary point than its accumulator, a register with more fraction bits than its sum; in
  floating point a multiplication by a power of two.
* rounding: a register, operand or product that drops bits, its shift included; in floating point a conversion of type.
* saturation: a register that its value could exceed by its bound, and each addition in an accumulator that saturates.
* load: a coefficient for each multiplication, a state word for each delay or tap that is read, the input.
* store: a word for each delay and for each tapped line, which turns instead of moving; the output.

Not counted: dither's generator, the loop itself, and the conversion of samples at the doors of our own kernels.
"""

from collections.abc import Iterator
from dataclasses import dataclass

from streamhost.diagram.nodes import Delay, Gain, Input, Node, Output, Residue, Round, Shift, Sum, Taps
from streamhost.formats import Fixed, Quantizer
from streamhost.program.program import Program, RoundArithmetic, SumArithmetic, TapsArithmetic, TermArithmetic


@dataclass(frozen=True)
class Operation:
    """An operation of a node, `count` times, on words of so many bits.

    `kind`: multiply, add, shift, round, saturate, load or store. `other`: of a multiplication, the bits of its coefficient.
    """

    kind: str
    bits: int
    count: int = 1
    other: int = 0


@dataclass(frozen=True)
class Work:
    """How many operations a frame of one channel takes, and how much memory a channel has; bytes are bits over 8, rounded up
    word by word."""

    multiplications: int
    additions: int
    shifts: int
    roundings: int
    saturations: int
    loads: int
    stores: int
    state_words: int
    state_bytes: int
    coefficient_words: int
    coefficient_bytes: int


def work(program: Program) -> Work:
    """The counts of a program, defined in this module's docstring."""
    done = list(operations(program))

    def of(kind: str) -> int:
        return sum(each.count for each in done if each.kind == kind)

    stored = [coefficient_bits(program, slot) for slot in range(len(program.diagram.slots))]
    return Work(
        multiplications=of("multiply"), additions=of("add"), shifts=of("shift"), roundings=of("round"),
        saturations=of("saturate"), loads=of("load"), stores=of("store"),
        state_words=program.state_words,
        state_bytes=sum(node.stores * _bytes(word_bits(program, index)) for index, node in enumerate(program.nodes)),
        coefficient_words=len(stored),
        coefficient_bytes=sum(map(_bytes, stored)),
    )


def _bytes(bits: int) -> int:
    return -(-bits // 8)


def operations(program: Program) -> Iterator[Operation]:
    """The operations of every node, in evaluation order."""
    for index in program.diagram.order:
        yield from node_operations(program, index)


def node_operations(program: Program, index: int) -> Iterator[Operation]:
    """The operations of one node."""
    node = program.nodes[index]
    yield from _memory(program, index, node)
    if isinstance(node, Gain):
        coefficient = coefficient_bits(program, node.coefficient)
        yield Operation("load", coefficient)
        yield Operation("multiply", value_bits(program, node.source), other=coefficient)
    elif isinstance(node, Residue):
        if has_residue(program, node):
            yield Operation("add", value_bits(program, index))
    elif isinstance(program.format, Fixed):
        yield from _fixed(program, index, node)
    else:
        yield from _floating(program, index, node)


def value_bits(program: Program, index: int) -> int:
    """How many bits a node's value takes by its bound, or the bits of its type."""
    if program.types:
        return 64 if program.types[index] == "float64" else 32
    return max(2, (program.numbers[index].bound - 1).bit_length() + 1)


def word_bits(program: Program, index: int) -> int:
    """How many bits the word has in which a node's value is kept: that of its register, where it is one."""
    node, found = program.nodes[index], program.arithmetic[index] if program.arithmetic else None
    while isinstance(node, Delay | Taps):
        index = node.source
        node, found = program.nodes[index], program.arithmetic[index] if program.arithmetic else None
    if isinstance(found, RoundArithmetic):
        return found.quantizer.word.bits
    if isinstance(node, Input) and isinstance(program.format, Fixed):
        return program.format.input.word.bits
    return value_bits(program, index)


def coefficient_bits(program: Program, slot: int) -> int:
    """The bits of a stored coefficient."""
    if program.stored is not None:
        return program.stored.words[slot].bits
    assert not isinstance(program.format, Fixed), "a fixed-point program stores its coefficients"
    return 64 if program.format.type == "float64" else 32


def could_saturate(program: Program, index: int) -> bool:
    """Whether the register at a Round saturates and its value could exceed its word."""
    node, found = program.nodes[index], program.arithmetic[index]
    assert isinstance(node, Round) and isinstance(found, RoundArithmetic), "a register"
    bound = program.numbers[node.source].bound
    rounded = (bound >> found.drop) + 1 if found.drop > 0 else bound << -found.drop
    return found.quantizer.overflow == "saturate" and rounded > -found.quantizer.word.low


def has_residue(program: Program, node: Residue) -> bool:
    """Whether a register drops bits that are kept; in floating point only where sums are wider than registers."""
    if program.types:
        return isinstance(program.nodes[node.source], Round)
    found = program.arithmetic[node.source]
    return isinstance(found, RoundArithmetic) and found.drop > 0


def term_operations(program: Program, term: TermArithmetic, fraction: int) -> Iterator[Operation]:
    """What is done to a term before it is added in an accumulator of that fraction."""
    number, bits = program.numbers[term.source], value_bits(program, term.source)
    at = number.fraction
    if term.keep is not None and term.keep < at:
        yield Operation("round", bits)
        at = term.keep
    if at - term.shift != fraction:
        yield Operation("shift", bits)


def _memory(program: Program, index: int, node: Node) -> Iterator[Operation]:
    bits = word_bits(program, index)
    if isinstance(node, Input):
        yield Operation("load", bits)
    elif isinstance(node, Output):
        yield Operation("store", word_bits(program, node.source))
    elif isinstance(node, Delay):
        yield Operation("load", bits)
        yield Operation("store", bits)
    elif isinstance(node, Taps) and node.stores:
        yield Operation("load", bits, node.stores)
        yield Operation("store", bits)


def _floating(program: Program, index: int, node: Node) -> Iterator[Operation]:
    bits = value_bits(program, index)
    if isinstance(node, Sum):
        yield Operation("add", bits, node.additions)
    elif isinstance(node, Shift):
        yield Operation("shift", bits)
    elif isinstance(node, Round) and value_bits(program, node.source) != bits:
        yield Operation("round", bits)
    elif isinstance(node, Taps):
        kept = coefficient_bits(program, node.coefficients[0])
        yield Operation("load", kept, node.multiplications)
        yield Operation("multiply", bits, node.multiplications, kept)
        yield Operation("add", bits, node.additions)


def _fixed(program: Program, index: int, node: Node) -> Iterator[Operation]:
    found = program.arithmetic[index]
    if isinstance(node, Sum) and isinstance(found, SumArithmetic):
        bits = _accumulator_bits(program, index, found)
        for term in found.terms:
            yield from term_operations(program, term, found.accumulator.fraction)
        yield Operation("add", bits, node.additions)
        if found.accumulator.overflow == "saturate":
            yield Operation("saturate", bits, len(found.terms))
    elif isinstance(node, Round) and isinstance(found, RoundArithmetic):
        bits = value_bits(program, node.source)
        if found.drop:
            yield Operation("round" if found.drop > 0 else "shift", bits)
        if could_saturate(program, index):
            yield Operation("saturate", bits)
    elif isinstance(node, Taps) and isinstance(found, TapsArithmetic):
        yield from _taps(program, index, node, found)


def _accumulator_bits(program: Program, index: int, found: SumArithmetic | TapsArithmetic) -> int:
    word = found.accumulator.word
    return word.bits if word is not None else value_bits(program, index)


def _taps(program: Program, index: int, node: Taps, found: TapsArithmetic) -> Iterator[Operation]:
    bits, sums = value_bits(program, node.source), _accumulator_bits(program, index, found)
    pairs = node.length // 2 if node.fold else 0
    middle = node.fold == "even" and node.length % 2 == 1
    yield Operation("add", bits + 1, pairs)
    yield Operation("add", sums, node.additions - pairs)
    for k, slot in enumerate(node.coefficients):
        last = middle and k == len(node.coefficients) - 1
        operand = found.middle if last else found.operand
        for quantizer, ordinal in zip((None if last else found.pre, operand), found.ordinals[k], strict=True):
            yield from _quantized(quantizer, ordinal, bits + 1)
        kept = coefficient_bits(program, slot)
        yield Operation("load", kept)
        yield Operation("multiply", operand.word.bits if operand else bits + (node.fold is not None and not last), other=kept)
        at = program.numbers[node.source].fraction if operand is None else operand.word.fraction
        at += _point(program, slot)
        if found.keeps[k] < at:
            yield Operation("round", bits + kept)
        if min(found.keeps[k], at) - (0 if last else found.halved) != found.accumulator.fraction:
            yield Operation("shift", bits + kept)
    if found.accumulator.overflow == "saturate":
        yield Operation("saturate", sums, len(node.coefficients))


def _quantized(quantizer: Quantizer | None, ordinal: int | None, bits: int) -> Iterator[Operation]:
    if quantizer is None:
        return
    if ordinal is not None:
        yield Operation("round", bits)
    if quantizer.overflow == "saturate":
        yield Operation("saturate", bits)


def _point(program: Program, slot: int) -> int:
    assert program.stored is not None, "a fixed-point program"
    return program.stored.words[slot].fraction
