"""The output guard: what goes to the ears begins low, stays under a ceiling, and ends at once when something is wrong."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from streamhost.errors import RequestError

CAUTION = (
    "Sound can hurt. Turn the volume down, and take headphones off the first time. A filter that runs away, wraps or rings is "
    "full scale, at once and for as long as it lasts. The output guard mutes what it knows to be wrong; it knows nothing of "
    "the sound pressure at your ear. streamhost is no protective device and no medical device; local codes and licensed "
    "practice rule."
)


@dataclass(frozen=True)
class Guard:
    """How the monitor's path is guarded; rendered files are not.

    Nothing passes `ceiling_dbfs` (at most 0). The gain comes up from `start_db` at `rise_db_per_s`. NaN, infinity, a sample
    above `runaway_dbfs` before the gain, and output at the ceiling (or less than `near_db` below) for longer than
    `sustained_s`, frames that are not counted down, mute at once, until the output is told to come up again.
    """

    ceiling_dbfs: float = 0.0
    start_db: float = -60.0
    rise_db_per_s: float = 30.0
    runaway_dbfs: float = 40.0
    sustained_s: float = 0.5
    near_db: float = 0.175

    def __post_init__(self) -> None:
        if not self.ceiling_dbfs <= 0.0:
            raise RequestError(f"ceiling_dbfs = {self.ceiling_dbfs}: a ceiling is at most 0 dBFS.")
        if not (self.start_db <= 0.0 and self.rise_db_per_s > 0.0 and self.sustained_s > 0.0 and self.near_db >= 0.0):
            raise RequestError("A guard starts at 0 dB or below, rises by some decibels a second and waits some seconds.")

    def put(self, host: NDArray[np.void], control: NDArray[np.void], rate: float) -> None:
        """Write it into the HOST and CONTROL records."""
        per_frame = 10.0 ** (self.rise_db_per_s / 20.0 / rate)
        host["up"], host["down"], host["low"] = per_frame, 1.0 / per_frame, 10.0 ** (self.start_db / 20.0)
        host["runaway"], host["loud_level"] = 10.0 ** (self.runaway_dbfs / 20.0), 10.0 ** (-self.near_db / 20.0)
        host["loud_most"] = int(self.sustained_s * rate)
        control["ceiling"] = _not_above(10.0 ** (self.ceiling_dbfs / 20.0))


def _not_above(value: float) -> float:
    """The largest float32 that is not above: then what the card gets is not above either."""
    single = np.float32(value)
    return float(single if float(single) <= value else np.nextafter(single, np.float32(0.0)))
