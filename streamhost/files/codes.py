"""Samples to integer codes, so that no library decides how they are rounded.

Compiled, since a long file spends much of its time here. The codes of one sample are those of `round` in Python.
"""

import ctypes
from functools import cache
from types import ModuleType

import numpy as np
import numpy.typing as npt

_TEXT = '''"""Samples to codes and codes to bytes."""

import numpy as np
from numba import carray, cfunc, types


@cfunc(types.int64(types.voidptr, types.voidptr, types.int64, types.float64), cache=CACHE, error_model="numpy")
def quantize(samples_, codes_, count, scale):
    samples = carray(samples_, (count,), np.float64)
    codes = carray(codes_, (count,), np.int32)
    clipped = 0
    for i in range(count):
        nearest = np.rint(samples[i] * scale)
        code = min(max(nearest, -scale), scale - 1.0)
        clipped += np.int64(code != nearest)
        codes[i] = np.int32(code)
    return clipped


@cfunc(types.void(types.voidptr, types.voidptr, types.int64), cache=CACHE, error_model="numpy")
def pack_24(codes_, packed_, count):
    codes = carray(codes_, (count,), np.int32)
    packed = carray(packed_, (count, 3), np.uint8)
    for i in range(count):
        code = codes[i]
        packed[i, 0] = np.uint8(code)
        packed[i, 1] = np.uint8(code >> 8)
        packed[i, 2] = np.uint8(code >> 16)
'''

_QUANTIZE = ctypes.CFUNCTYPE(ctypes.c_int64, *([ctypes.c_void_p] * 2), ctypes.c_int64, ctypes.c_double)
_PACK = ctypes.CFUNCTYPE(None, *([ctypes.c_void_p] * 2), ctypes.c_int64)


def quantize(samples: npt.NDArray[np.float64], bits: int) -> tuple[npt.NDArray[np.int32], int]:
    """The nearest codes of a `bits`-long word (at most 32), ties to even, saturated; and how many were saturated.

    `samples` are finite, 1.0 = full scale, any shape. A code k stands for k / 2**(bits - 1), so the largest code is one
    step below full scale.
    """
    contiguous = np.ascontiguousarray(samples, np.float64)
    codes = np.empty(samples.shape, np.int32)
    function = _QUANTIZE(_compiled().quantize.address)
    clipped = function(contiguous.ctypes.data, codes.ctypes.data, samples.size, 2.0 ** (bits - 1))
    return codes, int(clipped)


def little_endian(codes: npt.NDArray[np.int32], bits: int) -> bytes:
    """Codes of a word of 16, 24 or 32 bits as the bytes that a WAV file holds."""
    if bits != 24:
        return codes.astype(f"<i{bits // 8}").tobytes()
    packed = np.empty((codes.size, 3), np.uint8)
    _PACK(_compiled().pack_24.address)(np.ascontiguousarray(codes).ctypes.data, packed.ctypes.data, codes.size)
    return packed.tobytes()


@cache
def _compiled() -> ModuleType:
    from streamhost.cache import load_module

    return load_module(_TEXT, "sample codes")
