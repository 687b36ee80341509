"""Where a program rounds: every source of noise with the bits that it really drops, and the spectrum they make together.

The model: each error is white, uniform over the values it can take, uncorrelated with the signal and with the others
(Bennett 1948; Jackson 1970; Oppenheim & Schafer, ch. 6). Bits that are always 0 are not counted as dropped. An error that
is made once and passed on through delays is one source seen at several places.
"""

from dataclasses import dataclass, replace
from math import inf

import numpy as np
from numpy.typing import NDArray

from streamhost.diagram.nodes import Delay, Gain, Input, Residue, Round, Shift, Taps
from streamhost.diagram.norms import response_to_output
from streamhost.formats import Fixed
from streamhost.program.program import Program, RoundArithmetic, SumArithmetic, TapsArithmetic

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class Source:
    """One white error: variance and mean in units of full scale (squared), and the (node, delay) at which it is added.

    `largest`: the magnitude that it never exceeds.
    """

    label: str
    variance: float
    mean: float
    largest: float
    places: tuple[tuple[int, int], ...]


def traced_roundings(program: Program) -> tuple[int, ...]:
    """Registers that drop bits, in evaluation order: those whose residues a traced kernel writes down."""
    found = []
    for index in program.roundings:
        arithmetic = program.arithmetic[index] if program.arithmetic else None
        if isinstance(arithmetic, RoundArithmetic) and arithmetic.drop > 0:
            found.append(index)
    return tuple(found)


def noise_sources(program: Program, channel: int = 0) -> tuple[Source, ...]:
    """The sources of a fixed-point program that add noise in one channel, in evaluation order."""
    return _Finder(program, channel).find()


def separate_sources(program: Program, channel: int = 0) -> tuple[Source, ...]:
    """The same for a bound that is easy to check: more sources and larger errors than there are, never fewer or smaller.

    Each place has an error of its own, a floor and a truncation lose up to a whole step, and what a register, a state or a
    saturating accumulator holds may have any low bits.
    """
    found = _Finder(program, channel, plain=True).find()
    return tuple(replace(source, places=(place,)) for source in found for place in source.places)


def noise_spectrum(program: Program, frequencies: FloatArray, channel: int = 0, output: int = 0) -> FloatArray:
    """Predicted power density at an output, (frequencies,), at radians a frame.

    Its mean over 0 .. pi is the noise power in units of full scale squared. Infinite where an error does not die out.
    """
    return np.asarray(source_spectra(program, frequencies, channel, output).sum(axis=1), dtype=np.float64)


def source_spectra(program: Program, frequencies: FloatArray, channel: int = 0, output: int = 0) -> FloatArray:
    """The same of each source alone, (frequencies, sources)."""
    sources = noise_sources(program, channel)
    nodes = sorted({node for source in sources for node, _ in source.places})
    response = response_to_output(program.diagram, nodes, frequencies, channel, output=output)
    column = {node: response[:, k] for k, node in enumerate(nodes)}
    power = np.full((len(frequencies), len(sources)), inf)
    for k, source in enumerate(sources):
        if all(np.isfinite(column[node]).all() for node, _ in source.places):
            seen = [np.exp(-1j * delay * frequencies) * column[node] for node, delay in source.places]
            power[:, k] = source.variance * np.abs(sum(seen)) ** 2
    return power


def rounding_moments(drop: int, rounding: str) -> tuple[float, float]:
    """(variance, mean) of rounded minus exact, in steps of the result, where all values of the dropped bits come alike."""
    if drop <= 0:
        return 0.0, 0.0
    least = 2.0**-drop
    if rounding == "floor":
        return (1 - least**2) / 12, -(1 - least) / 2
    if rounding == "half-up":
        return (1 - least**2) / 12, least / 2
    if rounding == "toward-zero":
        return (1 - least) * (2 - least) / 6, 0.0
    return 1 / 12 + least**2 / 6, 0.0


def largest_error(drop: int, rounding: str, *, plain: bool = False) -> float:
    """The largest magnitude of rounded minus exact, in steps of the result: half a step, or all of one but the last bit.

    `plain`: or all of one.
    """
    if drop <= 0:
        return 0.0
    if rounding in ("floor", "toward-zero"):
        return 1.0 if plain else 1.0 - 2.0**-drop
    return 0.5


class _Finder:
    """Walks a program once and gathers its sources; `zeros` counts the low bits of each value that are always 0."""

    def __init__(self, program: Program, channel: int, *, plain: bool = False) -> None:
        assert isinstance(program.format, Fixed) and program.stored is not None, "fixed point has sources of this kind"
        self.program, self.nodes, self.plain = program, program.nodes, plain
        self.codes = [row[min(channel, len(row) - 1)] for row in program.stored.codes]
        self.zeros: dict[int, float] = {}
        self.found: dict[object, Source] = {}

    def find(self) -> tuple[Source, ...]:
        for index in self.program.diagram.order:
            self.visit(index)
        return tuple(self.found.values())

    def visit(self, index: int) -> None:
        node, arithmetic = self.nodes[index], self.program.arithmetic[index]
        if isinstance(arithmetic, SumArithmetic):
            self.visit_sum(index, arithmetic)
        elif isinstance(arithmetic, TapsArithmetic):
            self.visit_taps(index, arithmetic)
        elif isinstance(arithmetic, RoundArithmetic):
            self.visit_round(index, arithmetic)
        elif isinstance(node, Gain):
            self.zeros[index] = self.zeros[node.source] + trailing_zeros(self.codes[node.coefficient])
        elif isinstance(node, Shift):
            self.zeros[index] = self.zeros[node.source] + max(0, node.k)
        elif isinstance(node, Delay):
            self.zeros[index] = self.stored_zeros(index)
        else:
            self.zeros[index] = 0.0 if isinstance(node, Input | Residue) else self.zeros[node.reads[0]]

    def stored_zeros(self, index: int) -> float:
        if self.plain:
            return 0.0
        while isinstance(node := self.nodes[index], Delay):
            index = node.source
        arithmetic = self.program.arithmetic[index]
        return max(0.0, -arithmetic.drop) if isinstance(arithmetic, RoundArithmetic) else 0.0

    def add(
        self,
        key: object,
        label: str,
        drop: float,
        rounding: str,
        step: float,
        places: tuple[tuple[int, int], ...],
        sign: int = 1,
    ) -> None:
        """A source of an error that drops so many bits, in steps of `step`."""
        if drop > 0 and drop != inf:
            variance, mean = rounding_moments(int(drop), rounding)
            largest = largest_error(int(drop), rounding, plain=self.plain) * step
            self.merge(key, Source(label, variance * step**2, sign * mean * step, largest, places))

    def merge(self, key: object, source: Source) -> None:
        before = self.found.get(key)
        places = source.places if before is None else before.places + source.places
        self.found[key] = replace(source, places=places)

    def visit_round(self, index: int, arithmetic: RoundArithmetic) -> None:
        node = self.nodes[index]
        assert isinstance(node, Round), "a rounding has a Round"
        quantizer, step = arithmetic.quantizer, 2.0**-arithmetic.quantizer.word.fraction
        drop = max(0.0, arithmetic.drop - self.zeros[node.source])
        self.zeros[index] = 0.0 if self.plain else max(0.0, -arithmetic.drop)
        if quantizer.dither and arithmetic.drop > 0:
            variance = (1 - 4.0**-arithmetic.drop) / 4
            largest = (1.0 + largest_error(arithmetic.drop, quantizer.rounding)) * step
            self.merge(index, Source(node.label, variance * step**2, 0.0, largest, ((index, 0),)))
            return
        source, delay = self.behind_delays(node.source)
        self.add((source, quantizer), node.label, drop, quantizer.rounding, step, ((index, delay),))

    def behind_delays(self, index: int) -> tuple[int, int]:
        """The value that a chain of delays passes on, and how old it is."""
        delay = 0
        while isinstance(node := self.nodes[index], Delay):
            delay += node.n
            index = node.source
        return index, delay

    def visit_sum(self, index: int, arithmetic: SumArithmetic) -> None:
        fraction, least = arithmetic.accumulator.fraction, inf
        for k, term in enumerate(arithmetic.terms):
            at, zeros = self.program.numbers[term.source].fraction, self.zeros[term.source]
            label = f"{self.nodes[index].label}, term {k + 1}"
            if term.keep is not None and term.keep < at:
                scale = 2.0 ** (term.shift - term.keep)
                self.add(
                    (index, k, "product"), label, at - term.keep - zeros, term.rounding, scale, ((index, 0),), term.sign
                )
                zeros, at = max(0.0, zeros - (at - term.keep)), term.keep
            zeros, drop = zeros + max(0, term.shift), at + max(0, -term.shift) - fraction
            self.add((index, k, "term"), label, drop - zeros, "floor", 2.0**-fraction, ((index, 0),), term.sign)
            least = min(least, max(0.0, zeros - drop))
        saturates = arithmetic.accumulator.word is not None and arithmetic.accumulator.overflow == "saturate"
        self.zeros[index] = 0.0 if self.plain and saturates else least

    def visit_taps(self, index: int, arithmetic: TapsArithmetic) -> None:
        node = self.nodes[index]
        assert isinstance(node, Taps) and self.program.stored is not None, "a tapped line"
        self.zeros[index] = 0.0
        fraction = arithmetic.accumulator.fraction
        for k, slot in enumerate(node.coefficients):
            word = self.program.stored.words[slot]
            middle = node.fold == "even" and node.length % 2 == 1 and k == len(node.coefficients) - 1
            at = self.visit_operand(index, node, arithmetic, k, middle, self.codes[slot] * 2.0**-word.fraction)
            at += word.fraction
            keep, zeros = min(arithmetic.keeps[k], at), trailing_zeros(self.codes[slot])
            halved = 0 if node.fold is None or middle else arithmetic.halved
            label = f"{node.label}, tap {k}"
            self.add(
                (index, k, "product"),
                label,
                at - keep - zeros,
                arithmetic.rounding,
                2.0 ** (halved - keep),
                ((index, 0),),
            )
            self.add((index, k, "term"), label, keep - fraction, "floor", 2.0**-fraction, ((index, 0),))

    def visit_operand(
        self, index: int, node: Taps, arithmetic: TapsArithmetic, k: int, middle: bool, weight: float
    ) -> int:
        """The errors of one multiplication's operand, weighted by its coefficient; the operand's fraction bits."""
        at = self.program.numbers[node.source].fraction
        paired = node.fold is not None and not middle
        scale = 2.0 ** (arithmetic.halved if paired else 0)
        steps = (
            (arithmetic.pre, arithmetic.operand)
            if paired
            else (None, arithmetic.middle if middle else arithmetic.operand)
        )
        at += arithmetic.halved if paired else 0
        for stage, quantizer in enumerate(steps):
            if quantizer is not None:
                drop, step = at - quantizer.word.fraction, 2.0**-quantizer.word.fraction * scale * abs(weight)
                self.add((index, k, stage), f"{node.label}, operand {k}", drop, quantizer.rounding, step, ((index, 0),))
                at = quantizer.word.fraction
        return at


def trailing_zeros(code: int) -> float:
    """Low bits of a coefficient that are 0; infinitely many for 0."""
    return inf if code == 0 else float((code & -code).bit_length() - 1)
