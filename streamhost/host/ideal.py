"""The ideal run beside a lane: the same diagram with the coefficients as stored, on the input as the lane quantizes it."""

import numpy as np
from numpy.typing import NDArray

from streamhost.formats import Fixed
from streamhost.formats.words import ROUNDINGS
from streamhost.host.records import ARRAYS, LANE
from streamhost.program.ideal import ideal_of
from streamhost.program.native.kernel import Memory, Variant, compile_kernel, no_marks, no_trace
from streamhost.program.program import Program
from streamhost.realization import Realization

FLOAT64_DOOR, FLOAT32_DOOR = 6, 7


class Ideal:
    """Runs in float64, or in double-double where that would be too coarse to judge by; its output has then two halves."""

    def __init__(self, realization: Realization, channels: int) -> None:
        self._realization, self._channels = realization, channels
        chosen = ideal_of(realization.program)
        self.double = chosen.double
        variant = Variant(double=chosen.double)
        self.memory = Memory(chosen.program, channels, variant)
        self._kernel = compile_kernel(chosen.program, variant)
        self._unused = no_marks(), no_trace()
        self._record, self._added = np.zeros(1, LANE), np.zeros((0, 0))
        self.allocate(0)

    @property
    def address(self) -> int:
        """Of its record, for the compiled step."""
        return self._record.ctypes.data

    def allocate(self, block: int, added: NDArray[np.float64] | None = None) -> None:
        """Room for blocks of up to `block` frames. added: a ring for what the lane adds."""
        if added is not None:
            self._added = added
        columns = (2 if self.double else 1) * len(self._realization.outputs) * self._channels
        self._output, self._input = np.zeros((block, columns)), np.zeros((block, self._channels))
        memory, record = self.memory, self._record
        arrays: tuple[NDArray[np.generic], ...] = (
            memory.state, memory.coefficients, memory.keys, memory.meters, *self._unused)
        for name, array in zip(ARRAYS, arrays, strict=True):
            record[name] = array.ctypes.data
        record["kernel"], record["output"], record["input"] = (
            self._kernel.address, self._output.ctypes.data, self._input.ctypes.data)
        record["outputs"], record["columns"], record["doubled"] = len(self._realization.outputs), columns, self.double
        record["coefficient_words"] = memory.coefficients.size
        record["recent"] = self._added.ctypes.data if len(self._added) else 0
        self._set_door()

    def _set_door(self) -> None:
        format, record = self._realization.format, self._record
        if not isinstance(format, Fixed):
            record["door"] = FLOAT32_DOOR if format.type == "float32" else FLOAT64_DOOR
            return
        quantizer = format.input
        record["door"] = 1 + DOORS.index(quantizer.rounding)
        record["wraps"], record["scale"] = quantizer.overflow == "wrap", 2.0**quantizer.word.fraction
        record["low"], record["high"] = quantizer.word.low, quantizer.word.high

    def begin_at(self, frame: int) -> None:
        self._record["frame"] = frame

    def reset(self) -> None:
        """Zero state, frame 0."""
        self.memory.reset()
        self._record["frame"] = 0


DOORS = ("half-even", "half-up", "half-away", "floor", "toward-zero")
"""The roundings as the compiled step numbers them, from 1."""

assert set(DOORS) == set(ROUNDINGS), "the step knows every rounding"


def state_scales(program: Program) -> NDArray[np.float64]:
    """What a code in each word of state stands for: -1 for a float as it is, 0 for a residue, which the ideal has not."""
    from streamhost.diagram.carrying import residue_states

    if not program.state_words:
        return np.zeros(1)
    silent = residue_states(program.diagram)
    scales = np.zeros(program.state_words)
    place = 0
    for node in program.state_offsets:
        (source,) = program.nodes[node].reads
        value = 2.0 ** -program.numbers[source].fraction if program.numbers else -1.0
        for k in range(program.nodes[node].stores):
            scales[place + k] = 0.0 if place + k in silent else value
        place += program.nodes[node].stores
    return scales
