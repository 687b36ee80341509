"""A batch of states that runs through compiled kernels, on as many threads as there are cores."""

import os
from collections.abc import Callable, Sequence
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from streamhost.cache import load_module
from streamhost.program.native.batch import WIDTH, print_batch
from streamhost.program.native.kernel import SIGNATURE, Kernel
from streamhost.program.program import Program

Integers = NDArray[np.int64]

LOWEST, HIGHEST = -(1 << 63), (1 << 63) - 1


def cores() -> int:
    """How many cores this process may use."""
    return len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1


@dataclass(frozen=True, eq=False)
class Found:
    """What a batch came to, each (lanes,) or (nodes, lanes). `period` is in frames, 0 where the state has not come back."""

    period: Integers
    lost: NDArray[np.bool_]
    high: Integers
    low: Integers

    def at(self, chosen: NDArray[np.intp] | NDArray[np.bool_]) -> "Found":
        return Found(self.period[chosen], self.lost[chosen], self.high[:, chosen], self.low[:, chosen])


@dataclass(eq=False)
class Batch:
    """A fixed-point part in one channel of coefficients: states are codes, (words, lanes), inputs (lanes,), constant."""

    program: Program
    watched: tuple[int, ...]
    channel: int = 0
    _kernels: dict[bool, Kernel] = field(default_factory=dict)

    def run(self, states: Integers, inputs: Integers, frames: int) -> Integers:
        """The states so many frames on."""
        moved = np.empty_like(states)

        def work(part: slice) -> None:
            state, given = padded(states[:, part]), padded(inputs[None, part])
            self._call(False, (state, state, state, given), frames, 0)
            moved[:, part] = state[:, : part.stop - part.start]

        in_threads(work, states.shape[1])
        return moved

    def watch(self, states: Integers, inputs: Integers, reference: Integers, found: Found, frames: int, before: int
              ) -> tuple[Integers, Found]:
        """So many frames more, with what was found in the `before` frames since the reference."""
        moved, rows = np.empty_like(states), stacked(found)

        def work(part: slice) -> None:
            state, given, refer = padded(states[:, part]), padded(inputs[None, part]), padded(reference[:, part])
            seen = padded(rows[:, part])
            self._call(True, (state, refer, seen, given), frames, before)
            count = part.stop - part.start
            moved[:, part], rows[:, part] = state[:, :count], seen[:, :count]

        in_threads(work, states.shape[1])
        return moved, Found(rows[0], rows[1] != 0, rows[2::2], rows[3::2])

    def nothing(self, lanes: int) -> Found:
        """What is found before the first frame."""
        watched = (len(self.watched), lanes)
        return Found(np.zeros(lanes, np.int64), np.zeros(lanes, np.bool_), np.full(watched, LOWEST), np.full(watched, HIGHEST))

    @property
    def is_vector(self) -> bool:
        """Whether all values fit one word, and the lanes stand in vectors."""
        return f"@machine_code({WIDTH})" in print_batch(self.program, self.watched)

    def _call(self, watching: bool, arrays: Sequence[Integers], frames: int, before: int) -> None:
        """On (state, reference, what is found, inputs), each (rows, lanes) and the first changed in place."""
        assert self.program.stored is not None, "a fixed-point program"
        codes = [row[min(self.channel, len(row) - 1)] for row in self.program.stored.codes]
        coefficients = np.repeat(np.array(codes or [0], np.int64)[:, None], arrays[0].shape[1], axis=1)
        state, reference, found, inputs = arrays
        taken = (inputs, reference, state, coefficients, found, found, found, found)
        pointers = [array.ctypes.data for array in taken]
        SIGNATURE(self._kernel(watching).address)(*pointers, frames, state.shape[1], before)

    def _kernel(self, watching: bool) -> Kernel:
        if watching not in self._kernels:
            source = print_batch(self.program, self.watched if watching else None)
            module = load_module(source, f"batch {self.program.format.label}")
            self._kernels[watching] = Kernel(module.kernel.address, module)
        return self._kernels[watching]


def stacked(found: Found) -> Integers:
    rows = np.empty((2 + 2 * len(found.high), len(found.period)), np.int64)
    rows[0], rows[1], rows[2::2], rows[3::2] = found.period, found.lost, found.high, found.low
    return rows


def padded(array: Integers) -> Integers:
    """A copy of whole vectors of lanes, filled with zeros."""
    result = np.zeros((max(1, array.shape[0]), -(-max(1, array.shape[1]) // WIDTH) * WIDTH), np.int64)
    result[: array.shape[0], : array.shape[1]] = array
    return result


def in_threads(work: Callable[[slice], None], lanes: int) -> None:
    """`work` on the lanes, divided among the cores; kernels called by pointer let go of the interpreter."""
    parts = max(1, min(cores(), lanes // WIDTH))
    slices = [slice(k * lanes // parts, (k + 1) * lanes // parts) for k in range(parts)]
    if parts == 1:
        work(slices[0])
        return
    with ThreadPoolExecutor(parts) as pool:
        list(pool.map(work, slices))
