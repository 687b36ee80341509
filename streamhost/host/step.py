"""The compiled step: one block through every lane, and the meters of each.

A C function of its own, `step(x, records, lanes, frames, channels)`: x is the block, float64 (frames, channels);
records an int64 array of the addresses of the lanes' records. It allocates nothing, locks nothing and cannot raise,
so that a sound card, a file or a test clock can drive it alike.
"""

import ctypes
import hashlib
from dataclasses import dataclass
from pathlib import Path

from streamhost.cache import load_module
from streamhost.host.record import ARRAYS, RECORD

SIGNATURE = ctypes.CFUNCTYPE(None, *([ctypes.c_void_p] * 2), *([ctypes.c_int64] * 3))

_TEXT = '''"""The compiled step of the host."""

# addresses as pointers: {pointers}
import numpy as np
from numba import carray, cfunc, types

from streamhost.host.pointers import call_kernel, pointer

RECORD = np.dtype({record})


@cfunc(types.void(*([types.voidptr] * 2), *([types.int64] * 3)), cache=CACHE, error_model="numpy")
def step(x_, records_, lanes, frames, channels):
    records = carray(records_, (lanes,), np.int64)
    for k in range(lanes):
        lane = carray(pointer(records[k]), (1,), RECORD)[0]
        if lane.metered:
            marks = carray(pointer(lane.marks), (frames * channels,), np.uint8)
            for i in range(frames * channels):
                marks[i] = 0
        call_kernel(lane.kernel, x_, lane.output, {arrays}, frames, channels, lane.frame)
        lane.frame += frames
        y = carray(pointer(lane.output), (frames * lane.outputs * channels,), np.float64)
        peak, total, not_a_number = lane.peak, lane.sum_of_squares, 0
        for i in range(frames * lane.outputs * channels):
            v = y[i]
            if v != v:
                not_a_number += 1
            else:
                peak = max(peak, abs(v))
                total += v * v
        lane.peak, lane.sum_of_squares = peak, total
        lane.not_a_number += not_a_number
'''


@dataclass(frozen=True)
class Step:
    """The compiled step: its machine address, and the object that keeps it alive."""

    address: int
    owner: object

    def __call__(self, x: int, records: int, lanes: int, frames: int, channels: int) -> None:
        """Run one block; x and records are addresses."""
        SIGNATURE(self.address)(x, records, lanes, frames, channels)


def step_source() -> str:
    """The readable source of the step; equal for all hosts."""
    pointers = hashlib.sha256(Path(__file__).with_name("pointers.py").read_bytes()).hexdigest()[:16]
    arrays = ", ".join(f"lane.{name}" for name in ARRAYS)
    return _TEXT.format(pointers=pointers, record=RECORD.descr, arrays=arrays)


def compile_step() -> Step:
    """The step: from this process, from disk, or compiled now."""
    module = load_module(step_source(), "host step")
    return Step(module.step.address, module)
