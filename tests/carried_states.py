"""How far the output is off after a state was carried, by analysis alone: states and responses in double-double, no kernel.

Both diagrams have had the same noise. The state before, as its words hold it, is carried; the state that the other diagram
would have, had it run all along, is known to twice as many digits, and what the two make at the output is compared.
"""

from dataclasses import dataclass

import numpy as np

from streamhost import Realization
from streamhost.diagram.carrying import Frames, outputs_alone
from streamhost.diagram.doubled import Doubled, doubled, krylov, squares
from streamhost.diagram.linear import state_space
from streamhost.program.carrying import bridge

FRAMES = 1024
"""Of noise: what filters of these tests remember at most, or nearly; and of the output looked at."""
HALF_UNIT = 2.0**-53


@dataclass(frozen=True)
class Deviation:
    """Greatest over outputs, channels and frames.

    output: after the change; states: what rounding every state of both once makes at the output, one worst case;
    coefficients: how far the two outputs without input are apart, coefficients as stored; missed: as reported.
    """

    output: float
    states: float
    coefficients: float
    missed: float

    @property
    def floors(self) -> float:
        return self.output / max(self.states, self.coefficients, HALF_UNIT)


def deviation(before: Realization, after: Realization, channels: int = 1) -> Deviation:
    """Of the outputs that both have."""
    x = np.random.default_rng(3).uniform(-0.5, 0.5, (FRAMES, channels))
    firsts = [_state(before, x, channel) for channel in range(channels)]
    rounded = np.hstack([first.high for first in firsts])
    carried, missed = bridge(before.program, after.program, after.rate).carry(rounded, x)
    found = [_of_channel(before, after, channel, firsts[channel], _state(after, x, channel), carried[:, channel : channel + 1])
             for channel in range(channels)]
    return Deviation(*np.max(found, axis=0), missed)


def _of_channel(before: Realization, after: Realization, channel: int, first: Doubled, true: Doubled,
                carried: np.ndarray) -> tuple[float, float, float]:
    """Output, states, coefficients."""
    names = [name for name in before.outputs if name in after.outputs]
    was, goes_on = (_alone(each, [each.outputs.index(name) for name in names], channel) for each in (before, after))
    output = np.abs((goes_on @ (doubled(carried) + -true)).high).max()
    states = max((np.abs(rows.high) @ np.abs(state.high)).max() for rows, state in ((was, first), (goes_on, true)))
    apart = np.abs(((was @ first) + -(goes_on @ true)).high).max()
    return float(output), HALF_UNIT * float(states), float(apart)


def _alone(realization: Realization, outputs: list[int], channel: int) -> Doubled:
    return outputs_alone(_space(realization, channel), outputs, Frames(FRAMES, 1, 0))


def _state(realization: Realization, x: np.ndarray, channel: int) -> Doubled:
    """After the noise, from silence: the sum of A^k B u[N-1-k]; (states, 1)."""
    space = _space(realization, channel)
    answers = krylov(doubled(space.B.T.copy()), squares(doubled(space.A.T.copy()), FRAMES.bit_length()), FRAMES)
    return (doubled(x[::-1, channel][np.newaxis]) @ answers).transposed()


def _space(realization: Realization, channel: int):
    diagram = realization.program.diagram
    return state_space(diagram, min(channel, diagram.channels - 1))
