"""Sets of coefficients that a lane takes one after the other under the kernel and the state that it has."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from streamhost.errors import RequestError
from streamhost.host.lane import Lane
from streamhost.host.records import BANK_FRAMES
from streamhost.program.ideal import ideal_program
from streamhost.program.native.kernel import Memory, Variant, kernel_source
from streamhost.realization import Realization


@dataclass(frozen=True, eq=False)
class Banks:
    """Coefficients (sets, slots, channels) as the kernel has them, and as the ideal beside it does."""

    codes: NDArray[np.int64]
    ideal: NDArray[np.float64]

    @property
    def address(self) -> int:
        return int(self.codes.ctypes.data)

    @property
    def ideal_address(self) -> int:
        return int(self.ideal.ctypes.data)


def prepare_banks(lane: Lane, realizations: Sequence[Realization]) -> Banks:
    """The coefficients of each. RequestError where there is none, or one needs another kernel than the lane has."""
    if not realizations:
        raise RequestError("A lane is moved to at least one set of coefficients.")
    variant = Variant(metered=lane.metered)
    own, text = lane.realization.program.key, kernel_source(lane.realization.program, variant)
    for each in realizations:
        if each.program.key != own or kernel_source(each.program, variant) != text:
            raise RequestError("These coefficients need another diagram or other words than the lane has: run them as a lane "
                               "of their own and change to it.")
    codes = np.array([each.memory(lane.channels).coefficients.view(np.int64) for each in realizations])
    if lane.ideal is None:
        return Banks(codes, np.zeros(1))
    return Banks(codes, np.array([Memory(ideal_program(each.program), lane.channels).coefficients for each in realizations]))


def ramp(make: Callable[[float], Realization], first: float, last: float, frames: int) -> list[Realization]:
    """What a parameter makes on its way in a straight line from one value, where it is, to another: one every 32 frames."""
    count = max(1, -(-frames // BANK_FRAMES))
    return [make(last if k == count else first + (last - first) * k / count) for k in range(1, count + 1)]
