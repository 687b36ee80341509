"""Kernels against scipy.signal.sosfilt, their compilation, and the start of the command line. Medians of interleaved repeats.

    python tests/benchmarks/kernels.py
"""

import os
import statistics
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable

import numpy as np
from scipy.signal import sosfilt

import streamhost as sh
from streamhost.program.native.kernel import compile_kernel, no_marks, no_trace

FRAMES, REPEATS, PROCESSES = 4096, 400, 7

FIRST_CALL = """
import time, numpy as np, numba, streamhost as sh
from streamhost.program.native.kernel import compile_kernel
filter = {filter}
realization = sh.realize(filter, form={form!r}, decomposition={decomposition!r}, format={format!r})
start = time.perf_counter()
kernel = compile_kernel(realization.program)
from streamhost.program.native.kernel import no_marks, no_trace
x = np.zeros((64, 1))
kernel.call(realization.memory(1), x, np.empty_like(x), marks=no_marks(), trace=no_trace())
print(time.perf_counter() - start)
"""


def order_8() -> sh.Filter:
    return sh.design("butterworth", rate=48000, response="low-pass", order=8, frequency=1000)


def interleaved(ours: Callable[[], object], theirs: Callable[[], object]) -> tuple[float, float, float]:
    """Median nanoseconds a frame of both, and the median of their ratios pair by pair."""
    first, second = [], []
    for _ in range(REPEATS):
        start = time.perf_counter_ns()
        ours()
        middle = time.perf_counter_ns()
        theirs()
        first.append(middle - start)
        second.append(time.perf_counter_ns() - middle)
    ratios = [b / a for a, b in zip(first, second, strict=True)]
    return statistics.median(first) / FRAMES, statistics.median(second) / FRAMES, statistics.median(ratios)


def against_sosfilt(type_name: str, channels: int) -> None:
    realization = sh.realize(order_8(), form="transposed-2", format=type_name)
    sections = np.array([[*s.b, *s.a] for s in realization.built.sections]).astype(type_name)
    x = np.random.default_rng(1).uniform(-0.5, 0.5, (FRAMES, channels))
    y, same = np.empty_like(x), x.astype(type_name)
    kernel, memory = compile_kernel(realization.program), realization.memory(channels)
    marks, trace, state = no_marks(), no_trace(), np.zeros((len(sections), 2, channels), type_name)
    ours, theirs, ratio = interleaved(lambda: kernel.call(memory, x, y, marks=marks, trace=trace),
                                      lambda: sosfilt(sections, same, axis=0, zi=state))
    print(f"order-8 cascade, {type_name}, {channels} channels: {ours:6.1f} ns/frame, sosfilt {theirs:6.1f}, ratio {ratio:.2f}")


def first_call(label: str, **choices: object) -> None:
    """Seconds from a realization to its first block in fresh processes that have imported numba: with an empty kernel
    cache and with a filled one. Medians of 3 and 6."""
    cold, warm = [], []
    for _ in range(3):
        with tempfile.TemporaryDirectory() as folder:
            environment = {**os.environ, "STREAMHOST_CACHE": folder}
            for times in (cold, warm, warm):
                done = subprocess.run([sys.executable, "-c", FIRST_CALL.format(**choices)], env=environment, check=True,
                                      capture_output=True, text=True)
                times.append(float(done.stdout))
    print(f"{label}: first block {statistics.median(cold):.2f} s cold, {statistics.median(warm):.2f} s warm")


def help_start() -> None:
    """Whole processes: `streamhost --help` less `python -c pass`."""
    ours, bare = [], []
    for _ in range(PROCESSES):
        for times, command in ((ours, ["-m", "streamhost.commands.main", "--help"]), (bare, ["-c", "pass"])):
            start = time.perf_counter()
            subprocess.run([sys.executable, *command], check=True, capture_output=True)
            times.append(time.perf_counter() - start)
    print(f"streamhost --help: {1000 * (statistics.median(ours) - statistics.median(bare)):.0f} ms more than python -c pass")


def main() -> None:
    for type_name in ("float64", "float32"):
        for channels in (1, 2):
            against_sosfilt(type_name, channels)
    rows = [[*map(float, s.b), *map(float, s.a)] for s in sh.realize(order_8()).built.sections]
    for format in ("float32", "float64", "16x16+40"):
        sections = rows if format != "16x16+40" else [[0.25, 0.5, 0.25, *row[3:]] for row in rows]
        first_call(f"order-8 cascade, {format}", filter=f"sh.Filter.from_sections({sections!r}, rate=48000)",
                   form="transposed-2", decomposition="cascade", format=format)
    taps = "sh.Filter.from_coefficients(np.random.default_rng(1).uniform(-0.05, 0.05, 1000), rate=48000)"
    for format in ("float32", "float64"):
        first_call(f"1,000-tap FIR, {format}", filter=taps, form="direct-1", decomposition="whole", format=format)
    help_start()


if __name__ == "__main__":
    main()
