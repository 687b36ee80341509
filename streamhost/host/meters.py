"""What the step counted of a lane's output."""

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True)
class Meters:
    """Of all outputs and channels of a lane since its reset; 1.0 = full scale, NaN samples left out of both levels."""

    frames: int = 0
    samples: int = 0
    peak: float = 0.0
    sum_of_squares: float = 0.0
    not_a_number: int = 0

    def plus(self, block: NDArray[np.float64]) -> "Meters":
        """With a further block (frames, columns) counted."""
        numbers = block[~np.isnan(block)]
        return Meters(self.frames + len(block), self.samples + block.size,
                      max(self.peak, float(np.abs(numbers).max(initial=0.0))),
                      self.sum_of_squares + float((numbers**2).sum()), self.not_a_number + block.size - numbers.size)

    @property
    def is_finite(self) -> bool:
        """Whether every sample was a finite number."""
        return self.not_a_number == 0 and math.isfinite(self.peak)

    @property
    def peak_dbfs(self) -> float:
        """The largest sample; 0 dBFS is the peak of a full-scale sine. Minus infinity for silence."""
        return 20 * math.log10(self.peak) if self.peak > 0 else -math.inf

    @property
    def rms_dbfs(self) -> float:
        """The rms; a full-scale sine reads 0 dBFS, as AES17 has it. Minus infinity for silence and before any frame."""
        numbers = self.samples - self.not_a_number
        if numbers == 0 or self.sum_of_squares == 0:
            return -math.inf
        return 10 * math.log10(2 * self.sum_of_squares / numbers)
