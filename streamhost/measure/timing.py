"""What a frame costs on this machine."""

from statistics import median
from time import perf_counter_ns

import numpy as np
from numpy.typing import NDArray

from streamhost.program.native.kernel import Variant, compile_kernel, kernel_width, no_marks, no_trace
from streamhost.realization import Realization

BLOCK = 4096
REPEATS = 25


def ns_per_frame(realization: Realization, x: NDArray[np.float64]) -> float:
    """Nanoseconds that the plain kernel takes per frame, all channels together: the median over runs of one block.

    x: (frames, channels), of which the first 4096 frames at most are run, from zero state and on.
    """
    block = np.ascontiguousarray(x[:BLOCK])
    channels, program = block.shape[1], realization.program
    memory, kernel = realization.memory(channels), compile_kernel(program, Variant(width=kernel_width(program, channels)))
    y = np.empty((len(block), len(realization.outputs) * block.shape[1]))
    marks, trace = no_marks(), no_trace()
    times = []
    for _ in range(1 + REPEATS):
        began = perf_counter_ns()
        kernel.call(memory, block, y, marks=marks, trace=trace)
        times.append((perf_counter_ns() - began) / len(block))
    return median(times[1:])
