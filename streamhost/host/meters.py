"""What the step counted of a lane's output."""

import math
from dataclasses import dataclass


@dataclass(frozen=True)
class Meters:
    """Of all outputs and channels of a lane since its reset; 1.0 = full scale, NaN samples left out of both levels."""

    frames: int
    samples: int
    peak: float
    sum_of_squares: float
    not_a_number: int

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
