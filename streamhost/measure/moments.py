"""Mean and variance of samples that come in pieces, without loss where the mean is large."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray


@dataclass
class Moments:
    """Joined pairwise: T. F. Chan, G. H. Golub, R. J. LeVeque, The American Statistician 37 (1983)."""

    count: int = 0
    mean: float = 0.0
    squares: float = 0.0

    def add(self, samples: NDArray[np.float64]) -> None:
        if not len(samples):
            return
        mean = float(samples.mean())
        squares = float(((samples - mean) ** 2).sum())
        count = self.count + len(samples)
        step = mean - self.mean
        self.squares += squares + step**2 * self.count * len(samples) / count
        self.mean += step * len(samples) / count
        self.count = count

    @property
    def variance(self) -> float:
        return self.squares / self.count
