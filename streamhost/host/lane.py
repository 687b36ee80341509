"""A lane: a realization at work inside the host."""

import hashlib

import numpy as np
from numpy.typing import NDArray

from streamhost.errors import RequestError
from streamhost.formats import Fixed
from streamhost.host.ideal import Ideal, state_scales
from streamhost.host.meters import Meters
from streamhost.host.records import ARRAYS, LANE, LANE_METERS
from streamhost.program.native.kernel import Variant, compile_kernel, kernel_width, no_trace
from streamhost.program.native.meters import meters_by_kind
from streamhost.program.states import rings
from streamhost.realization import Realization, Tally, tally


class Lane:
    """A realization with state, meters and output of its own; the realization's own state is not touched.

    `channels` >= 1. A `metered` lane counts what its roundings do (`tally`) and marks where one overflowed; its output
    is the same. With its `ideal` beside it, what the lane adds can be heard as a difference. `match` is the gain by which
    it is heard. Raises RequestError where the realization has coefficients for another number of channels, or words at
    its doors that samples do not hold.
    """

    def __init__(
        self, realization: Realization, channels: int, *, metered: bool = False, ideal: bool = False, match: float = 1.0
    ) -> None:
        realization.check_samples()
        if not 0.0 < match < 1000.0:
            raise RequestError(f"match = {match}: a lane is heard by a gain above 0 and below 1000.")
        self.realization, self.channels, self.metered = realization, channels, metered
        self.memory = realization.memory(channels)
        width = kernel_width(realization.program, channels)
        self.kernel = compile_kernel(realization.program, Variant(metered=metered, width=width))
        self.ideal = Ideal(realization, channels) if ideal else None
        self._outputs = len(realization.outputs)
        self._trace = no_trace()
        self.banks: object = None
        self._kinds = _kinds(realization)
        self._scales = state_scales(realization.program)
        self._record, self._shown = np.zeros(1, LANE), np.zeros(1, LANE_METERS)
        self._recent = np.zeros((0, self._outputs * channels))
        self._record["match"] = match
        self.allocate(0)

    @property
    def match(self) -> float:
        """The gain by which it is heard."""
        return float(self._record["match"][0])

    @property
    def address(self) -> int:
        """Of the lane's record, for the compiled step."""
        return self._record.ctypes.data

    def allocate(
        self, block: int, recent: NDArray[np.float64] | None = None, shown: NDArray[np.void] | None = None,
        added: NDArray[np.float64] | None = None,
    ) -> None:
        """Room for blocks of up to `block` frames. The host that takes the lane calls it, outside the step.

        recent: a ring (frames, outputs * channels) for the last of its output, `added` for what it adds to its ideal; shown: a
        LANE_METERS record to count in.
        """
        self._output = np.zeros((block, self._outputs * self.channels))
        self._marks = np.zeros((block if self.metered else 0, self.channels), np.uint8)
        if recent is not None:
            self._recent = recent
        if shown is not None:
            shown[:] = self._shown
            self._shown = shown
        if self.ideal is not None:
            self.ideal.allocate(block, added)
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
        record["columns"] = self._output.shape[1]
        record["words"] = self.realization.program.state_words * self.channels
        record["coefficient_words"] = memory.coefficients.size
        record["kinds"], record["counters"] = self._kinds.ctypes.data, len(self._kinds)
        record["shown"], record["scales"] = self._shown.ctypes.data, self._scales.ctypes.data
        record["recent"] = self._recent.ctypes.data if len(self._recent) else 0
        record["ideal"] = self.ideal.address if self.ideal is not None else 0

    def show(self, frames: int) -> None:
        """Say how many frames the block in `output` has; the host does, after its step."""
        self._block = frames

    def begin_at(self, frame: int) -> None:
        """Count frames from here on: for runs that begin late."""
        self._record["frame"] = frame
        if self.ideal is not None:
            self.ideal.begin_at(frame)

    def moved_to(self, realization: Realization, banks: object) -> None:
        """It has, or soon will have, the coefficients of another realization."""
        self.realization, self.banks = realization, banks

    @property
    def output(self) -> NDArray[np.float64]:
        """The last block (frames, outputs * channels), its first output's channels first; the next takes its place."""
        return self._output[: self._block]

    @property
    def marks(self) -> NDArray[np.uint8]:
        """(frames, channels) of the last block: 1 where something overflowed; of a metered lane, else without rows."""
        return self._marks[: self._block]

    @property
    def recent(self) -> NDArray[np.float64]:
        """The ring of its last output: frame f of the host stands in row f modulo its length; without rows if it has none."""
        return self._recent

    @property
    def frame(self) -> int:
        """Frames since reset."""
        return int(self._record["frame"][0])

    @property
    def nanoseconds(self) -> int:
        """What its runs have taken since reset, its ideal included."""
        return int(self._shown["nanoseconds"][0])

    def state_hash(self) -> str:
        """SHA-256 of the words of state, newest first, whatever frame the rings have been turned to."""
        rows = [ring.row(self.frame) for ring in rings(self.realization.program)]
        return hashlib.sha256(np.ascontiguousarray(self.memory.state[rows]).tobytes()).hexdigest()

    @property
    def meters(self) -> Meters:
        """What the step counted of the output since reset."""
        shown = self._shown[0]
        samples = int(shown["samples"])
        return Meters(samples // self._output.shape[1], samples, float(shown["peak"]), float(shown["sum_of_squares"]),
                      int(shown["not_a_number"]))

    def tally(self) -> Tally:
        """What happened in the roundings since reset; all 0 of a lane that is not metered."""
        return tally(self.realization.program, self.memory.meters if self.metered else None)

    def reset(self) -> None:
        """Zero state, frame 0, all meters at 0."""
        self.memory.reset()
        self._output[:] = 0
        self._marks[:] = 0
        self._record["frame"] = 0
        self._shown[:] = 0
        if self.ideal is not None:
            self.ideal.reset()


def _kinds(realization: Realization) -> NDArray[np.int64]:
    """Of each counter of a metered kernel: 1 saturation, 2 wrap, 3 accumulator overflow, 0 none of these."""
    program = realization.program
    places = meters_by_kind(program) if isinstance(realization.format, Fixed) else ([], [], [])
    kinds = np.zeros(max(1, 1 + max((place for kind in places for place in kind), default=0)), np.int64)
    for number, kind in enumerate(places, 1):
        kinds[kind] = number
    return kinds
