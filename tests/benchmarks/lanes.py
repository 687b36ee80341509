"""Kernels that run several channels at once, against the same kernel one by one and scipy.signal.sosfilt in float64.

    python tests/benchmarks/lanes.py

An order-8 cascade; medians of interleaved repeats; * marks the width that `kernel_width` takes.
"""

import statistics
import time

import numpy as np
from scipy.signal import sosfilt

import streamhost as sh
from streamhost.formats import named_format
from streamhost.program.native.kernel import Memory, Variant, compile_kernel, kernel_width, no_marks, no_trace

FORMATS = {"float64": "transposed-2", "float32": "transposed-2", "16x16+40": "direct-1", "32x32+64": "direct-1"}
CHANNELS, WIDTHS, SAMPLES, REPEATS = (1, 2, 4, 8, 64), (1, 2, 4, 8, 16, 32), 1 << 16, 60


def measured(realization: sh.Realization, channels: int, width: int) -> tuple[float, float]:
    """Median nanoseconds a sample, and how many times as long sosfilt takes, pair by pair."""
    program, sections = realization.program, np.array([[*s.b, *s.a] for s in realization.built.sections])
    x = np.random.default_rng(1).uniform(-0.5, 0.5, (SAMPLES // channels // 4, channels))
    kernel, memory, y = compile_kernel(program, Variant(width=width)), Memory(program, channels), np.empty_like(x)
    marks, trace, state = no_marks(), no_trace(), np.zeros((len(sections), 2, channels))
    ours, theirs = [], []
    for _ in range(REPEATS):
        start = time.perf_counter_ns()
        kernel.call(memory, x, y, marks=marks, trace=trace)
        middle = time.perf_counter_ns()
        sosfilt(sections, x, axis=0, zi=state)
        ours.append(middle - start)
        theirs.append(time.perf_counter_ns() - middle)
    ratios = [b / a for a, b in zip(ours, theirs, strict=True)]
    return statistics.median(ours) / x.size, statistics.median(ratios)


def main() -> None:
    filter = sh.design("butterworth", rate=48000, response="low-pass", order=8, frequency=1000)
    for name, form in FORMATS.items():
        realization = sh.realize(filter, form=form, format=named_format(name))
        for channels in CHANNELS:
            for width in (width for width in WIDTHS if width <= channels):
                nanoseconds, ratio = measured(realization, channels, width)
                mark = "*" if width == kernel_width(realization.program, channels) else " "
                print(f"{name:9} {channels:3} channels, width {width:2}{mark} {nanoseconds:6.2f} ns/sample, ratio {ratio:5.2f}")


if __name__ == "__main__":
    main()
