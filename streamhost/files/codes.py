"""Samples to integer codes, so that no library decides how they are rounded."""

import numpy as np
import numpy.typing as npt


def quantize(samples: npt.NDArray[np.float64], bits: int) -> tuple[npt.NDArray[np.int32], int]:
    """The nearest codes of a `bits`-long word (at most 32), ties to even, saturated; and how many were saturated.

    `samples` are finite, 1.0 = full scale, any shape. A code k stands for k / 2**(bits - 1), so the largest code is one
    step below full scale.
    """
    scale = 2.0 ** (bits - 1)
    nearest = np.rint(samples * scale)
    codes = np.clip(nearest, -scale, scale - 1.0)
    return codes.astype(np.int32), int(np.count_nonzero(codes != nearest))
