"""A realization and its ideal on one input, block after block."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from streamhost.program.ideal import ideal_of, quantized_input
from streamhost.program.native.kernel import Memory, Variant, compile_kernel, no_marks, no_trace, trace_width
from streamhost.realization import Realization, Tally, tally

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Block:
    """What came of one block. The next block does not overwrite its arrays.

    output, and difference, which is output minus ideal: (frames, outputs, channels). marks: 1 where something overflowed,
    (frames, channels). trace: what a traced kernel wrote of every frame and channel, (frames, channels, columns).
    """

    output: FloatArray
    difference: FloatArray
    marks: NDArray[np.uint8]
    trace: FloatArray


class Run:
    """A realization from zero state, beside the ideal run of its stored coefficients on the quantized input."""

    def __init__(self, realization: Realization, channels: int) -> None:
        realization.check_samples()
        self.program, self.outputs, self.channels = realization.program, len(realization.outputs), channels
        self._realization = realization
        self._kernel = compile_kernel(self.program, Variant(metered=True, traced=True))
        self.ideal = ideal_of(self.program)
        self._variant = Variant(double=self.ideal.double)
        self._ideal_kernel = compile_kernel(self.ideal.program, self._variant)
        self.reset()

    def reset(self) -> None:
        """Zero state of both, and nothing counted."""
        self._memory = self._realization.memory(self.channels)
        self._ideal_memory = Memory(self.ideal.program, self.channels, self._variant)

    def restart(self) -> None:
        """Back to zero state, frame 0."""
        self._memory.reset()
        self._ideal_memory.reset()

    def step(self, x: FloatArray) -> Block:
        """Run the next block (frames, channels), 1.0 = full scale."""
        frames = len(x)
        output, marks = np.empty((frames, self.outputs, self.channels)), np.zeros(x.shape, np.uint8)
        trace = np.empty((frames, self.channels, max(1, trace_width(self.program))))
        self._kernel.call(self._memory, np.ascontiguousarray(x), output, marks=marks, trace=trace)
        clean = np.ascontiguousarray(quantized_input(self.program, x))
        ideal = np.empty((frames, (2 if self.ideal.double else 1) * self.outputs, self.channels))
        self._ideal_kernel.call(self._ideal_memory, clean, ideal, marks=no_marks(), trace=no_trace())
        with np.errstate(over="ignore", invalid="ignore"):  # an unstable one may run away to infinity
            difference = output - ideal[:, : self.outputs]
            if self.ideal.double:
                difference -= ideal[:, self.outputs :]
        return Block(output, difference, marks, trace)

    def tally(self) -> Tally:
        """What happened in the roundings so far."""
        return tally(self.program, self._memory.meters)
