"""Blocks timed one by one inside compiled code: a kernel called by its address, as the host's step does it, between two clocks.

Two loops calibrate. The chain is two dependent operations of one cycle each, again and again: what it takes tells how fast the
processor runs. The crowd is many such chains side by side, which fill a core: where it takes longer while the chain does not,
something else runs on the same core, as it does where one core is sold as two processors.
"""

import ctypes
import hashlib
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from statistics import median
from types import ModuleType

import numpy as np
from numpy.typing import NDArray

from streamhost.cache import load_module
from streamhost.errors import MachineError
from streamhost.host import pointers
from streamhost.program.native.kernel import Variant, compile_kernel, kernel_width, no_marks, no_trace
from streamhost.realization import Realization
from streamhost.signals import white

LONGEST_BLOCK = 4096
STRETCH = 2 * LONGEST_BLOCK
SEED, PEAK_DBFS = 1, -20.0
STEPS, REPEATS, START = 2048, 5, 0x5DEECE66D
CYCLES_PER_STEP = 2

TEXT = '''"""Times blocks of kernels."""

# addresses as pointers: {pointers}
from numba import cfunc, types

from streamhost.host.pointers import call_kernel, nanoseconds, set_word, word


@cfunc(types.void(types.int64, types.int64, types.int64), cache=CACHE, error_model="numpy")
def timed(task, times, blocks):
    kernel, frames, frame, stretches, stride = word(task, 0), word(task, 9), word(task, 11), word(task, 12), word(task, 13)
    for k in range(blocks):
        if word(task, 14) != 0:
            for i in range(word(task, 15)):
                set_word(word(task, 3), i, word(word(task, 14), i))
        x = word(task, 1) + k % stretches * stride
        before = nanoseconds()
        if kernel != 0:
            call_kernel(kernel, x, word(task, 2), word(task, 3), word(task, 4), word(task, 5), word(task, 6), word(task, 7),
                        word(task, 8), frames, word(task, 10), frame)
        set_word(times, k, nanoseconds() - before)
        frame += frames
    set_word(task, 11, frame)


@cfunc(types.int64(types.int64, types.int64, types.int64), cache=CACHE, error_model="numpy")
def chain(steps, start, out):
    s = start
    before = nanoseconds()
    for i in range(steps):
        s = (s >> 1) + (s ^ start)
    took = nanoseconds() - before
    set_word(out, 0, s)
    return took


@cfunc(types.int64(types.int64, types.int64, types.int64), cache=CACHE, error_model="numpy")
def crowd(steps, start, out):
    a, b, c, d, e, f = start, start + 1, start + 2, start + 3, start + 4, start + 5
    before = nanoseconds()
    for i in range(steps):
        a = (a >> 1) + (a ^ start)
        b = (b >> 1) + (b ^ start)
        c = (c >> 1) + (c ^ start)
        d = (d >> 1) + (d ^ start)
        e = (e >> 1) + (e ^ start)
        f = (f >> 1) + (f ^ start)
    took = nanoseconds() - before
    set_word(out, 0, a ^ b ^ c ^ d ^ e ^ f)
    return took
'''

TIMED = ctypes.CFUNCTYPE(None, ctypes.c_int64, ctypes.c_int64, ctypes.c_int64)
LOOP = ctypes.CFUNCTYPE(ctypes.c_int64, ctypes.c_int64, ctypes.c_int64, ctypes.c_int64)


@cache
def _module() -> ModuleType:
    digest = hashlib.sha256(Path(pointers.__file__).read_bytes()).hexdigest()
    return load_module(TEXT.replace("{pointers}", digest), "profile")


def middle_mean(values: NDArray[np.float64]) -> float:
    """The mean of the middle half."""
    quarter = len(values) // 4
    return float(np.sort(values)[quarter : len(values) - quarter].mean())


class Lane:
    """A realization on so many channels, ready to be timed by its plain kernel on noise."""

    def __init__(self, realization: Realization, channels: int) -> None:
        program = realization.program
        self.realization, self.channels, self.width = realization, channels, kernel_width(program, channels)
        self._kernel = compile_kernel(program, Variant(width=self.width))
        self._memory = realization.memory(channels)
        self._x: NDArray[np.float64] = np.ascontiguousarray(white(STRETCH, channels, SEED, PEAK_DBFS))
        self._silence: NDArray[np.float64] = np.zeros((LONGEST_BLOCK, channels))
        self._y = np.empty((LONGEST_BLOCK, len(realization.outputs) * channels))
        self._marks, self._trace = no_marks(), no_trace()

    def task(self, frames: int, *, tail: bool) -> "Task":
        """What the compiled driver is told: noise and the state that it leaves, or silence from subnormal states."""
        memory, x = self._memory, self._x
        if tail:
            x = self._silence
        state = self._subnormal() if tail else None
        arrays = (x, self._y, memory.state, memory.coefficients, memory.keys, memory.meters, self._marks, self._trace)
        stretches = 1 if tail else STRETCH // frames
        words = [self._kernel.address, *(array.ctypes.data for array in arrays), frames, self.channels, memory.frame,
                 stretches, frames * self.channels * 8, state.ctypes.data if state is not None else 0, memory.state.size]
        return Task(np.array(words, np.int64), (self, state))

    def _subnormal(self) -> NDArray[np.float64]:
        """The state of the running filter, scaled until its largest is just subnormal: what a decaying tail passes through."""
        tiny = max(float(np.finfo(kind).tiny) for kind in self.realization.program.types)
        state: NDArray[np.float64] = self._memory.state.astype(np.float64)
        largest = float(np.abs(state).max(initial=0.0))
        return np.ascontiguousarray(state * (0.5 * tiny / largest)) if 0.0 < largest < np.inf else state


class Task:
    """Words for the compiled driver, and what keeps their addresses alive."""

    def __init__(self, words: NDArray[np.int64], owners: object) -> None:
        self.words, self._owners = words, owners


@dataclass(frozen=True)
class Speed:
    """Nanoseconds that a step of the calibration chain takes now; how many such steps one of the crowd takes, which tells what
    else runs on the core; and the least that it took in any of the short runs."""

    chain: float
    crowding: float
    least_crowding: float


class Machine:
    """The machine that this runs on: times of blocks and of the calibration loops."""

    def __init__(self) -> None:
        if pointers.MONOTONIC is None:
            raise MachineError("This system has no clock that compiled code can read by name: profile runs on Linux and macOS.")
        module = _module()
        self._timed = TIMED(module.timed.address)
        self._chain, self._crowd = LOOP(module.chain.address), LOOP(module.crowd.address)
        self._out = np.zeros(1, np.int64)
        self._clock_ns = middle_mean(self._times(Task(np.array([0] * 12 + [1, 0, 0, 0], np.int64), ()), 256))

    def calibrate(self) -> Speed:
        """How fast the processor is now: medians of a few short runs of either loop."""
        out = self._out.ctypes.data
        chain: list[int] = []
        crowd: list[int] = []
        for _ in range(REPEATS):
            chain.append(self._chain(STEPS, START, out))
            crowd.append(self._crowd(STEPS, START, out))
        own = self._clock_ns
        step = median(chain) - own
        return Speed(step / STEPS, (median(crowd) - own) / step, (min(crowd) - own) / step)

    def block_times(self, lane: Lane, frames: int, blocks: int, *, tail: bool = False) -> NDArray[np.float64]:
        """Nanoseconds of each of so many blocks, one after the other, less what reading the clock takes."""
        return np.maximum(self._times(lane.task(frames, tail=tail), blocks) - self._clock_ns, 0.0)

    def _times(self, task: Task, blocks: int) -> NDArray[np.float64]:
        times = np.zeros(blocks, np.int64)
        self._timed(task.words.ctypes.data, times.ctypes.data, blocks)
        return times.astype(np.float64)
