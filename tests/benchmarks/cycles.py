"""A batch of states against the same arithmetic in a plain C loop, and the time each section of the shipped presets takes.

    python tests/benchmarks/cycles.py [--presets]

Section-steps a second: of a second-order section without input, all lanes together, on all cores that may be used. The C loop
is compiled by gcc -O3 -march=native and runs one state after the other on one core, and the batch beside it too.
"""

import ctypes
import statistics
import subprocess
import sys
import tempfile
import time
from pathlib import Path

import numpy as np

import streamhost as sh
from streamhost.measure.cycles.assembling import section_cycles
from streamhost.measure.cycles.sections import Effort, examine
from streamhost.presets import load_preset
from streamhost.presets.realizing import realize_preset
from streamhost.program.autonomous import loops_of, part_of
from streamhost.program.native import batches
from streamhost.program.native.batches import Batch
from streamhost.shipped import names

LANES, FRAMES, REPEATS = 4096, 50_000, 9

SCALAR = r"""
#include <stdint.h>
void run(int64_t *s, int64_t a1, int64_t a2, long lanes, long frames) {
    for (long lane = 0; lane < lanes; lane++) {
        int64_t y1 = s[lane], y2 = s[lanes + lane];
        for (long n = 0; n < frames; n++) {
            int64_t v = 0 - a2 * y2 - a1 * y1, q = (v >> 14) + ((v >> 13) & 1);
            q = q < -32768 ? -32768 : q > 32767 ? 32767 : q;
            y2 = y1;
            y1 = q;
        }
        s[lane] = y1;
        s[lanes + lane] = y2;
    }
}
"""


def section(form: str, signal: str = "Q1.15", coefficients: str = "Q2.14") -> Batch:
    filter = sh.design("low-pass", rate=48000, frequency=1000, q=0.7)
    program = sh.realize(filter, form=form, format=sh.Fixed(signal, coefficients=coefficients)).program
    part = part_of(program, loops_of(program)[0])
    return Batch(part.program, part.program.roundings)


def states_of(batch: Batch) -> np.ndarray:
    states = sum(node.stores for node in batch.program.nodes)
    return np.random.default_rng(1).integers(-20000, 20000, (states, LANES))


def rate(batch: Batch) -> float:
    """Median of millions of section-steps a second."""
    states, inputs = states_of(batch), np.zeros(LANES, np.int64)
    batch.run(states, inputs, 1)
    found = []
    for _ in range(REPEATS):
        start = time.perf_counter()
        batch.run(states, inputs, FRAMES)
        found.append(LANES * FRAMES / (time.perf_counter() - start) / 1e6)
    return statistics.median(found)


def against_c() -> None:
    batch, frames = section("direct-1"), FRAMES // 5
    states, inputs = states_of(batch), np.zeros(LANES, np.int64)
    codes = [row[0] for row in batch.program.stored.codes]
    labels = [slot.label for slot in batch.program.diagram.slots]
    a1, a2 = codes[labels.index("a1")], codes[labels.index("a2")]
    with tempfile.TemporaryDirectory() as folder:
        source, library = Path(folder, "scalar.c"), Path(folder, "scalar.so")
        source.write_text(SCALAR, encoding="utf-8")
        subprocess.run(["gcc", "-O3", "-march=native", "-shared", "-fPIC", "-o", library, source], check=True)
        run = ctypes.CDLL(str(library)).run
        run.argtypes = [ctypes.c_void_p, ctypes.c_int64, ctypes.c_int64, ctypes.c_long, ctypes.c_long]
        batch.run(states, inputs, 1)
        ratios, scalar = [], []
        cores, batches.cores = batches.cores, lambda: 1
        for _ in range(REPEATS):
            same = states.copy()
            start = time.perf_counter()
            run(same.ctypes.data, a1, a2, LANES, frames)
            middle = time.perf_counter()
            moved = batch.run(states, inputs, frames)
            end = time.perf_counter()
            assert (moved == same).all(), "the same arithmetic"
            ratios.append((middle - start) / (end - middle))
            scalar.append(LANES * frames / (middle - start) / 1e6)
        batches.cores = cores
    print(f"one core: C loop {statistics.median(scalar):.0f} million section-steps/s, batch {statistics.median(ratios):.1f} x")


def presets() -> None:
    """Every section of the shipped fixed-point presets: proven or searched, the largest cycle alone, and the time."""
    for name in names("preset"):
        realization = realize_preset(load_preset(name))
        if not isinstance(realization.format, sh.Fixed):
            continue
        program = realization.program
        for loop in loops_of(program):
            start = time.perf_counter()
            found = section_cycles(None, program, examine(program, loop, 0, Effort(), lambda share, doing: None), 0)
            taken = time.perf_counter() - start
            told = "proven" if found.proven else "searched"
            print(f"{name:36} {found.name:10} {told:8} {found.found_lsb:>11} LSB of {found.word:6} "
                  f"states {found.box_states!s:>13} {taken:6.1f} s", flush=True)


def main() -> None:
    if "--presets" in sys.argv:
        presets()
        return
    against_c()
    for form, signal, coefficients in (("direct-1", "Q1.15", "Q2.14"), ("direct-2", "Q1.15", "Q2.14"),
                                       ("transposed-2", "Q1.15", "Q2.14"), ("direct-1", "Q1.31", "Q2.30")):
        batch = section(form, signal, coefficients)
        kind = "vectors" if batch.is_vector else "one state after the other"
        steps, cores = rate(batch), batches.cores()
        print(f"{form} {signal} x {coefficients}: {steps:.0f} million section-steps/s, {kind}, on {cores} cores")


if __name__ == "__main__":
    main()
