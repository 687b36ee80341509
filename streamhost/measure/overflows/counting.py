"""How often each register overflows on a signal, and in which frame first."""

import copy
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from streamhost.program.native.kernel import Memory, Variant, compile_kernel, trace_width
from streamhost.realization import Realization

BLOCK = 4096


@dataclass(frozen=True, eq=False)
class Counts:
    """By meter of the kernel, (meters,): how often, and the first frame, -1 for never."""

    number: NDArray[np.int64]
    first: NDArray[np.int64]


class _Runner:
    def __init__(self, realization: Realization) -> None:
        self._program, self._outputs = realization.program, len(realization.outputs)
        self._kernel = compile_kernel(realization.program, Variant(metered=True, traced=True))

    def run(self, memory: Memory, x: NDArray[np.float64]) -> None:
        frames, channels = x.shape
        trace = np.empty((frames, channels, max(1, trace_width(self._program))))
        y = np.empty((frames, self._outputs * channels))
        self._kernel.call(memory, np.ascontiguousarray(x), y, marks=np.zeros(x.shape, np.uint8), trace=trace)


def counted(realization: Realization, x: NDArray[np.float64]) -> Counts:
    """Run a signal (frames, channels) from zero state."""
    runner, memory = _Runner(realization), realization.memory(x.shape[1])
    first = np.full(len(memory.meters), -1)
    for start in range(0, len(x), BLOCK):
        block, before = x[start : start + BLOCK], copy.deepcopy(memory)
        runner.run(memory, block)
        for meter in np.flatnonzero((memory.meters > 0) & (first < 0)):
            first[meter] = start + _first_in(runner, before, block, int(meter))
    return Counts(memory.meters.copy(), first)


def _first_in(runner: _Runner, before: Memory, block: NDArray[np.float64], meter: int) -> int:
    """The frame of a block at which a meter that is still 0 counts for the first time, by halving."""
    low, high = 0, len(block)
    while high - low > 1:
        middle, memory = (low + high) // 2, copy.deepcopy(before)
        runner.run(memory, block[:middle])
        low, high = (low, middle) if memory.meters[meter] else (middle, high)
    return low
