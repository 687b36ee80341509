"""Gains by which lanes are heard equally loud."""

from collections.abc import Sequence

import numpy as np

from streamhost.errors import RequestError
from streamhost.host.engine import BLOCK, Device, Host
from streamhost.host.lane import Lane
from streamhost.host.sources import generated
from streamhost.realization import Realization

SECONDS = 2.0
MOST_DB = 40.0


def matching_gains(realizations: Sequence[Realization]) -> list[float]:
    """For each the gain that brings its rms on pink noise, -20 dBFS peak, to that of the first.

    RequestError where one is silent or not finite, or 40 dB apart from the first.
    """
    lanes = [Lane(each, 1) for each in realizations]
    host = Host(lanes, BLOCK, device=Device(0, 1), source=generated("pink", realizations[0].rate, 1))
    out = np.zeros((BLOCK, 1))
    for _ in range(int(SECONDS * host.rate / BLOCK) + 1):
        host.step(None, out)
    powers = [lane.meters.sum_of_squares for lane in lanes]
    gains = []
    for number, (lane, power) in enumerate(zip(lanes, powers, strict=True), 1):
        ratio = powers[0] / power if power > 0.0 and lane.meters.is_finite else 0.0
        if not 10.0 ** (-MOST_DB / 10.0) <= ratio <= 10.0 ** (MOST_DB / 10.0):
            raise RequestError(f"Lane {number} cannot be matched in level: on pink noise it is silent, not finite or "
                               f"{MOST_DB:g} dB apart from lane 1.")
        gains.append(float(np.sqrt(ratio)))
    return gains
