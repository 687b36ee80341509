"""A compiled kernel and what it works on: state, coefficients, dither keys, meters."""

import ctypes
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from streamhost.cache import load_module
from streamhost.formats import Fixed
from streamhost.program.dither import dither_key
from streamhost.program.native.double import print_double
from streamhost.program.native.fixed import print_fixed
from streamhost.program.native.floating import print_float
from streamhost.program.native.frame import Variant, trace_width
from streamhost.program.native.meters import meter_count
from streamhost.program.program import Program

PLAIN = Variant()
SIGNATURE = ctypes.CFUNCTYPE(None, *([ctypes.c_void_p] * 8), *([ctypes.c_int64] * 3))


def kernel_source(program: Program, variant: Variant = PLAIN) -> str:
    """The readable source of a program's kernel."""
    if variant.double:
        return print_double(program, variant)
    return print_fixed(program, variant) if isinstance(program.format, Fixed) else print_float(program, variant)


def kernel_width(program: Program, channels: int) -> int:
    """How many of so many channels a kernel of this program had best run at once, by measurement (`tests/benchmarks/lanes.py`).

    Words of 128 bits never gain, other integers from four channels on, for want of short vector multiplications and shifts.
    """
    fixed = isinstance(program.format, Fixed)
    if fixed and (channels < 4 or any(number.carrier > 64 for number in program.numbers)):
        return 1
    return 1 << (min(channels, 8 if fixed else 16).bit_length() - 1)


@dataclass(frozen=True)
class Kernel:
    """A compiled kernel: its machine address, to be called by pointer, and the object that keeps it alive."""

    address: int
    owner: object

    def call(self, memory: "Memory", x: NDArray[np.generic], y: NDArray[np.generic], *, marks: NDArray[np.uint8],
             trace: NDArray[np.float64]) -> None:
        """Run one block: x (frames, channels) into y (frames, outputs * channels), both contiguous."""
        frames, channels = x.shape
        arrays = (x, y, memory.state, memory.coefficients, memory.keys, memory.meters, marks, trace)
        SIGNATURE(self.address)(*(a.ctypes.data for a in arrays), frames, channels, memory.frame)
        memory.frame += frames


def compile_kernel(program: Program, variant: Variant = PLAIN) -> Kernel:
    """The kernel of a program: from this process, from disk, or compiled now."""
    module = load_module(kernel_source(program, variant), program.format.label)
    return Kernel(module.kernel.address, module)


class Memory:
    """What a kernel keeps between blocks, for a number of channels. Arrays are (words, channels)."""

    def __init__(self, program: Program, channels: int, variant: Variant = PLAIN) -> None:
        fixed = isinstance(program.format, Fixed)
        dtype = np.int64 if fixed else np.float64
        self.channels, self.frame = channels, 0
        self.state = np.zeros((max(1, variant.words * program.state_words), channels), dtype)
        self.coefficients = np.zeros((max(1, len(program.diagram.slots)), channels), dtype)
        self.keys = np.zeros((max(1, program.ordinals), channels), np.uint64)
        self.meters = np.zeros(meter_count(program), np.int64)
        if len(program.diagram.slots):
            values = np.array(program.stored.codes, dtype) if program.stored else program.diagram.values
            self.coefficients[:] = values
        if isinstance(program.format, Fixed):
            seed = program.format.dither_seed
            for ordinal in range(program.ordinals):
                self.keys[ordinal] = [dither_key(seed, ordinal + 1, channel) for channel in range(channels)]

    def reset(self) -> None:
        """Zero state, frame 0, meters at 0."""
        self.state[:] = 0
        self.meters[:] = 0
        self.frame = 0


def no_marks() -> NDArray[np.uint8]:
    """Where a plain kernel writes nothing."""
    return np.zeros(1, np.uint8)


def no_trace() -> NDArray[np.float64]:
    """Where an untraced kernel writes nothing."""
    return np.zeros(1, np.float64)


__all__ = [
    "Kernel", "Memory", "Variant", "compile_kernel", "kernel_source", "kernel_width", "no_marks", "no_trace", "trace_width",
]
