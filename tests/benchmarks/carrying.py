"""Every ordered pair of structures that carry a filter: one runs, the other takes over, and how far its output is off.

    python tests/benchmarks/carrying.py [--all] [PART OF A FILTER'S NAME ...]

All forms that draw a filter, as a cascade where they can, else whole, or in all decompositions (--all); in float64, at 48
kHz, on the same noise: A runs for two seconds, B takes over and runs for two more. The deviation is that of B's samples after
the change from the output that B would have had, had it run from the start: the same diagram with its coefficients as stored,
in double-double. The rounding floor of a structure is how far its own float64 output, unswitched, is from that over all four
seconds. The floor of a pair is the greatest of the two structures' own, of half a unit in the last place of 1.0, and of how far
their outputs in double-double are apart: float64 rounds the coefficients of each, and by what the two filters then differ no
state can mend. Structures that are unstable with their coefficients as stored are left out.

One line a filter: how many forms and structures carry it; in floors the worst deviation, the most that was reported as missed,
and the worst deviation where the floor is less than a unit in the last place ("quiet"); processor time of one pair.
"""

import sys
import time
from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from streamhost import Filter, Realization, design, forms, realize
from streamhost.errors import StructureError
from streamhost.program.carrying import Carried
from streamhost.program.ideal import ideal_program
from streamhost.program.native.kernel import Memory, Variant, compile_kernel, no_marks, no_trace

RATE = 48000
HALF = 96000
LEAST = 2.0**-53


def noise() -> np.ndarray:
    return np.random.default_rng(0).uniform(-0.5, 0.5, 2 * HALF)


def filters() -> dict[str, Filter]:
    """Low-passes and high-passes down to 20 Hz, a narrow notch, and finite responses."""
    found = {
        f"{kind} {response} {order} at {frequency} Hz": design(
            kind, rate=RATE, response=response, order=order, frequency=frequency,
            **({"ripple_db": 0.5, "stopband_db": 60} if kind == "elliptic" else {}))
        for response in ("low-pass", "high-pass") for kind in ("butterworth", "elliptic")
        for order in (4, 6, 8) for frequency in (20, 200, 2000)
    }  # fmt: skip
    found["notch 1 Hz wide at 50 Hz"] = design("notch", rate=RATE, frequency=50, q=50)
    found["moving average of 16"] = design("moving-average", rate=RATE, length=16)
    found["41 symmetric taps"] = design("fir-equiripple", rate=RATE, response="low-pass", taps=41, frequency=4000,
                                        stop_frequency=6000)
    return found


@dataclass
class Run:
    """A structure that has run on the noise.

    `realization` stands at the change. ideal: (frames, outputs) in double-double, rounded once; `floor` is of all outputs.
    """

    realization: Realization
    ideal: np.ndarray
    floor: float

    @cached_property
    def name(self) -> str:
        return f"{self.realization.form}, {self.realization.decomposition}"


def structures(filter: Filter, *, all_decompositions: bool = False) -> Iterator[Realization]:
    """Each that carries the filter and is stable as stored; what two decompositions draw alike once."""
    for form in forms():
        seen: set[tuple[str, bytes]] = set()
        for decomposition in ("cascade", "whole", "parallel"):
            try:
                realization = realize(filter, form=form, decomposition=decomposition)
            except StructureError:
                continue
            same = (realization.diagram.hash, realization.diagram.values.tobytes())
            stable = not realization.unstable or realization.diagram.response_ends()
            if same not in seen and stable and (all_decompositions or not seen):
                seen.add(same)
                yield realization


def run(realization: Realization, x: np.ndarray) -> Run:
    """Both halves once for the floor, then the first half again, up to the change."""
    ideal = in_double_double(realization, x)
    own = realization.process(x).reshape(len(x), -1)
    realization.reset()
    realization.process(x[: len(x) // 2])
    return Run(realization, ideal.sum(axis=2), float(np.abs((own - ideal[:, :, 0]) - ideal[:, :, 1]).max()))


def in_double_double(realization: Realization, x: np.ndarray) -> np.ndarray:
    """(frames, outputs, 2) of the diagram with its coefficients as stored: high and low parts."""
    program, variant = ideal_program(realization.program), Variant(double=True)
    outputs = len(realization.outputs)
    y = np.empty((len(x), 2 * outputs))
    kernel, memory = compile_kernel(program, variant), Memory(program, 1, variant)
    kernel.call(memory, np.ascontiguousarray(x[:, np.newaxis]), y, marks=no_marks(), trace=no_trace())
    return y.reshape(len(x), outputs, 2)


@dataclass(frozen=True)
class Change:
    """What came of one change: deviation and floor at the output, and what was reported."""

    pair: str
    deviation: float
    floor: float
    carried: Carried

    @property
    def floors(self) -> float:
        return self.deviation / self.floor


def change(before: Run, after: Run, target: Realization, x: np.ndarray) -> Change:
    """`target` is a second realization of the structure that takes over; its compiled kernel is kept."""
    carried = target.carry_from(before.realization)
    half = len(x) // 2
    deviation = np.abs(target.process(x[half:]).reshape(len(x) - half, -1) - after.ideal[half:]).max()
    apart = np.abs(before.ideal - after.ideal).max()
    floor = max(before.floor, after.floor, LEAST, float(apart))
    return Change(f"{before.name} -> {after.name}", float(deviation), floor, carried)


def changes(runs: list[Run], x: np.ndarray) -> Iterator[Change]:
    for after in runs:
        its = after.realization
        target = realize(its.filter, form=its.form, decomposition=its.decomposition)
        yield from (change(before, after, target, x) for before in runs if before is not after)


def line(name: str, filter: Filter, x: np.ndarray, *, all_decompositions: bool = False) -> str:
    """One row of the table. Time is of the processor, of carrying and running on."""
    runs = [run(realization, x) for realization in structures(filter, all_decompositions=all_decompositions)]
    start = time.process_time()
    found = sorted(changes(runs, x), key=lambda change: change.floors)
    spent = (time.process_time() - start) / len(found)
    same = [change.floors for change in found if change.floor < 2.0 * LEAST]
    missed = max((change.carried.missed / change.floor for change in found if change.carried.missed is not None), default=0.0)
    forms_of_it = len({each.realization.form for each in runs})
    return (f"{name:32s} {forms_of_it:5d} {len(runs):10d} {len(found):6d} {found[-1].floors:7.2f} {missed:7.2f} "
            f"{max(same, default=0.0):7.2f} {spent * 1e3:6.0f}   {found[-1].pair}")


def main(arguments: list[str]) -> None:
    parts = [argument for argument in arguments if argument != "--all"]
    print(f"{'filter':32s} forms structures  pairs   worst  missed   quiet     ms   the worst pair")
    for name, filter in filters().items():
        if not parts or any(part in name for part in parts):
            print(line(name, filter, noise(), all_decompositions="--all" in arguments), flush=True)


if __name__ == "__main__":
    main(sys.argv[1:])
