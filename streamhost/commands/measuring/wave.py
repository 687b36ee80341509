"""Audio that an instrument found."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True, eq=False)
class Wave:
    """For a file of that name: samples (frames, channels), 1.0 = full scale."""

    name: str
    samples: NDArray[np.float64]
