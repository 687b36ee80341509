"""What those outside the step see and say, in one piece of memory without addresses, which several processes may share."""

from typing import Any

import numpy as np
from numpy.typing import NDArray

from streamhost.errors import RequestError
from streamhost.host.records import BINS, CONTROL, HOST_METERS, LANE_METERS, LOG, LOGGED, MOST_LANES


def layout(width: int, channels: int, recent: int = 0, recording: int = 0) -> np.dtype[np.void]:
    """The fields, one after the other: control, meters, lanes, histogram, log, and the rings of audio.

    width: columns of a lane's output; recent: frames of the rings `heard`, `sent` (what the guard is given), `outputs` and
    `added` (of each lane, and what it adds to its ideal where that runs beside it), where frame f of the run stands in row
    f modulo their length; recording: frames of the ring of what is heard, which `meters.recorded` and `control.drained`
    count in and out.
    """
    return np.dtype([
        ("control", CONTROL), ("meters", HOST_METERS), ("lanes", LANE_METERS, (MOST_LANES,)),
        ("histogram", "<i8", (BINS,)), ("log", LOG, (LOGGED,)),
        ("heard", "<f8", (recent, width)), ("sent", "<f8", (recent, channels)),
        ("outputs", "<f8", (MOST_LANES, recent, width)),
        ("added", "<f8", (MOST_LANES, recent, width)), ("recording", "<f8", (recording, width)),
    ])


class Shared:
    """Views of that memory; `buffer` holds at least `layout(...).itemsize` bytes, zeroed, else memory of its own is taken."""

    def __init__(self, width: int, channels: int, recent: int = 0, recording: int = 0, buffer: Any = None) -> None:
        kind = layout(width, channels, recent, recording)
        whole = np.zeros(1, kind) if buffer is None else np.frombuffer(buffer, kind, 1)
        self.whole = whole
        self.control: NDArray[np.void] = whole["control"]
        self.meters: NDArray[np.void] = whole["meters"]
        self.lanes: NDArray[np.void] = whole["lanes"][0]
        self.histogram: NDArray[np.int64] = whole["histogram"][0]
        self.log: NDArray[np.void] = whole["log"][0]
        self.heard: NDArray[np.float64] = whole["heard"][0]
        self.sent: NDArray[np.float64] = whole["sent"][0]
        self.outputs: NDArray[np.float64] = whole["outputs"][0]
        self.added: NDArray[np.float64] = whole["added"][0]
        self.recording: NDArray[np.float64] = whole["recording"][0]

    def come_up(self) -> None:
        """Let the monitor come up from its start, from mute or after the guard has shut. The step obeys at its next block."""
        self.control["mute"] = 0
        self.control["come_up"] += 1

    def mute(self) -> None:
        """Silence the monitor at once."""
        self.control["mute"] = 1

    def set_monitor(self, gain_db: float) -> None:
        """The monitor's gain, which it moves to by its ramp: at most 0 dB. RequestError above."""
        if not gain_db <= 0.0:
            raise RequestError(f"gain_db = {gain_db}: the monitor's gain is at most 0 dB.")
        self.control["gain"] = 10.0 ** (gain_db / 20.0)
