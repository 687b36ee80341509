"""A lane: a realization at work inside the host."""

import numpy as np
from numpy.typing import NDArray

from streamhost.host.meters import Meters
from streamhost.host.record import ARRAYS, RECORD
from streamhost.program.native.kernel import Variant, compile_kernel, kernel_width, no_trace
from streamhost.realization import Realization, Tally, tally


class Lane:
    """A realization with state, meters and output of its own; the realization's own state is not touched.

    `channels` >= 1. A `metered` lane counts what its roundings do (`tally`) and marks where one overflowed; its output
    is the same. Raises RequestError where the realization has coefficients for another number of channels, or words at
    its doors that samples do not hold.
    """

    def __init__(self, realization: Realization, channels: int, *, metered: bool = False) -> None:
        realization.check_samples()
        self.realization, self.channels, self.metered = realization, channels, metered
        self.memory = realization.memory(channels)
        width = kernel_width(realization.program, channels)
        self.kernel = compile_kernel(realization.program, Variant(metered=metered, width=width))
        self._outputs = len(realization.outputs)
        self._trace = no_trace()
        self._record = np.zeros(1, RECORD)
        self.allocate(0)

    @property
    def address(self) -> int:
        """Of the lane's record, for the compiled step."""
        return self._record.ctypes.data

    def allocate(self, block: int) -> None:
        """Room for blocks of up to `block` frames. The host that takes the lane calls it, outside the step."""
        self._output = np.zeros((block, self._outputs * self.channels))
        self._marks = np.zeros((block if self.metered else 0, self.channels), np.uint8)
        self._block = 0
        self._connect()

    def _connect(self) -> None:
        memory = self.memory
        arrays: tuple[NDArray[np.generic], ...] = (
            memory.state,
            memory.coefficients,
            memory.keys,
            memory.meters,
            self._marks,
            self._trace,
        )
        record = self._record
        record["kernel"], record["output"] = self.kernel.address, self._output.ctypes.data
        for name, array in zip(ARRAYS, arrays, strict=True):
            record[name] = array.ctypes.data
        record["outputs"], record["metered"] = self._outputs, self.metered

    def show(self, frames: int) -> None:
        """Say how many frames the block in `output` has; the host does, after its step."""
        self._block = frames

    @property
    def output(self) -> NDArray[np.float64]:
        """The last block (frames, outputs * channels), its first output's channels first; the next takes its place."""
        return self._output[: self._block]

    @property
    def marks(self) -> NDArray[np.uint8]:
        """(frames, channels) of the last block: 1 where something overflowed; of a metered lane, else without rows."""
        return self._marks[: self._block]

    @property
    def frame(self) -> int:
        """Frames since reset."""
        return int(self._record["frame"][0])

    @property
    def meters(self) -> Meters:
        """What the step counted of the output since reset."""
        peak, squares, bad = (self._record[name][0] for name in ("peak", "sum_of_squares", "not_a_number"))
        return Meters(self.frame, self.frame * self._output.shape[1], float(peak), float(squares), int(bad))

    def tally(self) -> Tally:
        """What happened in the roundings since reset; all 0 of a lane that is not metered."""
        return tally(self.realization.program, self.memory.meters if self.metered else None)

    def reset(self) -> None:
        """Zero state, frame 0, all meters at 0."""
        self.memory.reset()
        self._output[:] = 0
        self._marks[:] = 0
        for name in ("frame", "peak", "sum_of_squares", "not_a_number"):
            self._record[name] = 0
