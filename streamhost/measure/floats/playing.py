"""A realization on noise and on the silence after it, every node watched."""

from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from streamhost.diagram.nodes import Delay
from streamhost.program.native.kernel import Memory, Variant, compile_kernel, no_marks, no_trace
from streamhost.realization import Realization
from streamhost.signals import level, white

FloatArray = NDArray[np.float64]

SEED = 1
SIGNAL_S = 1.0
PEAK_DBFS = -20.0
BLOCK = 1 << 12


def noise(frames: int) -> FloatArray:
    """White, uniform, (frames,), with 47 bits: codes of 24 would often be summed without rounding."""
    high, low = (white(frames, 1, seed, 0.0)[:, 0] for seed in (SEED, SEED + 1))
    return (high + 2.0**-23 * low) * level(PEAK_DBFS)


@dataclass(frozen=True, eq=False)
class Moment:
    """A kernel's state, to go on from."""

    state: FloatArray
    frame: int


class Player:
    """From zero state, all channels the same signal; what the nodes hold comes as (frames, channels, nodes)."""

    def __init__(self, realization: Realization) -> None:
        self.realization, self.program = realization, realization.program
        self.channels = self.program.diagram.channels
        self._memory: Memory = realization.memory(self.channels)
        self._kernel = compile_kernel(self.program, Variant(metered=True, traced=True))

    @cached_property
    def delays(self) -> tuple[int, ...]:
        """The nodes that are delays."""
        return tuple(index for index, node in enumerate(self.program.nodes) if isinstance(node, Delay))

    def blocks(self, x: FloatArray) -> Iterator[FloatArray]:
        """The traces of a signal (frames,), block after block."""
        for start in range(0, len(x), BLOCK):
            yield self.play(x[start : start + BLOCK])

    def play(self, x: FloatArray) -> FloatArray:
        """The trace of one block (frames,)."""
        block = np.ascontiguousarray(np.repeat(x[:, None], self.channels, axis=1))
        y = np.empty((len(x), len(self.realization.outputs) * self.channels))
        trace = np.empty((len(x), self.channels, len(self.program.nodes)))
        self._kernel.call(self._memory, block, y, marks=np.zeros(block.shape, np.uint8), trace=trace)
        return trace

    def moment(self) -> Moment:
        return Moment(self._memory.state.astype(np.float64), self._memory.frame)

    @property
    def silent(self) -> bool:
        """Whether every state is 0."""
        return not self._memory.state.any()

    def repeats(self, most: int) -> int | None:
        """The period with which the states repeat without input, of up to so many frames; None where none is seen.

        What is in a ring lies in its old place only after whole turns of it.
        """
        then, rings = self.moment(), [node.stores for node in self.program.nodes if node.stores > 1]
        for period in range(1, most + 1):
            self.play(np.zeros(1))
            if np.array_equal(self._memory.state, then.state) and not any(period % ring for ring in rings):
                return period
        return None


def timed(realization: Realization, x: FloatArray, moment: Moment, repeats: int = 25) -> float:
    """Nanoseconds a frame of the plain kernel on a signal (frames,), each time from the same moment: the median."""
    from statistics import median
    from time import perf_counter_ns

    channels = realization.program.diagram.channels
    memory, kernel = realization.memory(channels), compile_kernel(realization.program)
    block = np.ascontiguousarray(np.repeat(x[:, None], channels, axis=1))
    y = np.empty((len(x), len(realization.outputs) * channels))
    marks, trace, times = no_marks(), no_trace(), []
    for _ in range(1 + repeats):
        memory.state[:], memory.frame = moment.state, moment.frame
        began = perf_counter_ns()
        kernel.call(memory, block, y, marks=marks, trace=trace)
        times.append((perf_counter_ns() - began) / len(block))
    return median(times[1:])
