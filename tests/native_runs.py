"""Running a program by its kernel, in any division into blocks, and by the definition with its coverage counted."""

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from streamhost.diagram.nodes import Gain, Input
from streamhost.program.definition import FixedDefinition
from streamhost.program.native.kernel import Memory, Variant, compile_kernel, trace_width
from streamhost.program.program import Program, RoundArithmetic
from streamhost.program.run import input_code
from streamhost.program.sources import traced_roundings


@dataclass(frozen=True)
class Run:
    """What a kernel gave: outputs (frames, outputs, channels), meters, overflow marks, trace, and its memory."""

    y: NDArray[np.float64]
    meters: NDArray[np.int64]
    marks: NDArray[np.uint8]
    trace: NDArray[np.float64]
    memory: Memory


def run_native(program: Program, x: NDArray[np.generic], variant: Variant = Variant(), *,  # noqa: B008
               blocks: Sequence[int] | None = None) -> Run:
    """x is (frames, channels); `blocks` are frame counts that add up to its length."""
    frames, channels = x.shape
    kernel, memory = compile_kernel(program, variant), Memory(program, channels, variant)
    outputs = variant.words * len(program.diagram.outputs)
    y = np.empty((frames, outputs * channels), np.int64 if variant.codes else np.float64)
    marks = np.zeros((frames, channels), np.uint8)
    trace = np.zeros((frames, channels, max(1, trace_width(program))))
    start = 0
    for count in blocks or [frames]:
        part = slice(start, start + count)
        block, out = np.ascontiguousarray(x[part]), y[part]
        kernel.call(memory, block, out, marks=marks[part], trace=trace[part])
        start += count
    assert start == frames
    return Run(y.reshape(frames, outputs, channels), memory.meters.copy(), marks, trace, memory)


class CountingDefinition(FixedDefinition):
    """The definition, with the corners it went through counted: ties, both sides of overflow, operands at an extreme."""

    def __init__(self, program: Program, channel: int = 0) -> None:
        super().__init__(program, channel)
        self.corners: Counter[str] = Counter()
        self.residues: list[list[float]] = []

    def step(self, code: int) -> tuple[int, ...]:
        """Also writes down what each rounding that drops bits has dropped, over its register's step."""
        outputs = super().step(code)
        self.residues.append([self.dropped[index] / 2.0 ** self.program.arithmetic[index].drop
                              for index in traced_roundings(self.program)])
        return outputs

    def evaluate(self, index: int, code: int) -> int:
        node = self.nodes[index]
        value = super().evaluate(index, code)
        if isinstance(node, Gain):
            bound = self.numbers[node.source].bound
            operand = self.value[node.source]
            self.corners["operand lowest"] += operand == -bound
            self.corners["operand highest"] += operand == bound - 1
            self.corners["operand 0"] += operand == 0
        if isinstance(node, Input):
            self.corners["frames"] += 1
        return value

    def round(self, index: int, value: int, arithmetic: RoundArithmetic, *, residue: bool = True) -> int:
        quantizer, drop = arithmetic.quantizer, arithmetic.drop
        result = super().round(index, value, arithmetic, residue=residue)
        if drop > 0:
            rest = value - (value >> drop << drop)
            if rest == 1 << drop - 1:
                self.corners[f"tie {'above' if value > 0 else 'below'} 0, {'odd' if value >> drop & 1 else 'even'}"] += 1
            self.corners["nothing dropped"] += rest == 0
        nearest = value / 2.0**drop
        if nearest >= quantizer.word.high + 1:
            self.corners["overflow above"] += 1
        if nearest < quantizer.word.low - 1:
            self.corners["overflow below"] += 1
        return result


def run_counting(program: Program, codes: NDArray[np.int64]) -> tuple[NDArray[np.int64], Counter[str], list[FixedDefinition]]:
    """The definition on codes (frames, channels), what corners it took, and the evaluators of the channels."""
    corners: Counter[str] = Counter()
    columns, evaluators = [], []
    for channel in range(codes.shape[1]):
        evaluator = CountingDefinition(program, channel)
        columns.append(evaluator.run([int(code) for code in codes[:, channel]]))
        corners += evaluator.corners
        evaluators.append(evaluator)
    return np.moveaxis(np.array(columns, np.int64), 0, 2), corners, evaluators


def codes_of(program: Program, x: NDArray[np.float64]) -> NDArray[np.int64]:
    """The codes of a real signal; the low bits that a float64 has no room for are filled at random."""
    quantizer = program.format.input  # type: ignore[union-attr]
    codes = np.array([[input_code(float(v), quantizer) for v in row] for row in x], np.int64).reshape(x.shape)
    return codes ^ np.random.default_rng(0).integers(0, 1 << max(0, quantizer.word.bits - 53), codes.shape)


def busy(frames: int, channels: int, seed: int) -> NDArray[np.float64]:
    """Noise, full-scale squares of a period that resonates low, impulses, extremes, silence, not-a-number and beyond scale."""
    rng = np.random.default_rng(seed)
    x = rng.uniform(-1.0, 1.0, (frames, channels))
    third = frames // 3
    x[third : 2 * third] = np.sign(np.sin(np.arange(third)[:, None] * rng.uniform(0.02, 0.4, channels)))
    x[2 * third :] = 0.0
    x[:8, :] = np.array([1.0, -1.0, 0.5, np.nan, 1e9, -3.0, 2.0**-20, -(2.0**-16)])[:, None]
    x[2 * third] = 1.0
    return x
