"""The block engine: the same input through every lane, by one call of the compiled step."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from streamhost.errors import RequestError
from streamhost.host.lane import Lane
from streamhost.host.step import compile_step

BLOCK = 4096
"""Frames of a block unless said: small enough for the processor's cache, large enough that calls cost nothing."""


class Host:
    """Lanes that run on one input, of blocks of up to `block` frames.

    How a signal is divided into blocks makes no difference to any bit. All lanes have the same number of channels,
    and a lane stands in one host. Raises RequestError where there is no lane or they differ in channels.
    """

    def __init__(self, lanes: Sequence[Lane], block: int = BLOCK) -> None:
        channels = {lane.channels for lane in lanes}
        if len(channels) != 1:
            raise RequestError(
                f"A host runs at least one lane, all of one number of channels; these have {sorted(channels)}."
            )
        if block < 1:
            raise RequestError(f"A host's blocks have at least 1 frame, not {block}.")
        assert len({id(lane) for lane in lanes}) == len(lanes), "a lane stands in a host once"
        self.lanes, self.block, self.channels = tuple(lanes), block, channels.pop()
        self.frames = 0
        self._step = compile_step()
        for lane in self.lanes:
            lane.allocate(block)
        self._records = np.array([lane.address for lane in self.lanes], np.int64)

    def step(self, x: NDArray[np.float64]) -> None:
        """Run one block (frames, channels), 1.0 = full scale; then each lane's `output` holds what came of it.

        Raises RequestError for another shape or more than `block` frames.
        """
        if x.ndim != 2 or x.shape[1] != self.channels or len(x) > self.block:
            raise RequestError(
                f"A block of shape {x.shape} does not fit this host: (up to {self.block}, {self.channels}) is needed."
            )
        frames = len(x)
        contiguous = np.ascontiguousarray(x, np.float64)
        self._step(contiguous.ctypes.data, self._records.ctypes.data, len(self.lanes), frames, self.channels)
        self.frames += frames
        for lane in self.lanes:
            lane.show(frames)
