"""The host driven by a clock instead of a sound card: in real time, or as fast as it goes."""

import time
from collections.abc import Callable

import numpy as np

from streamhost.host.engine import Host


def run_on_clock(host: Host, frames: int, *, real_time: bool = True, between: Callable[[], None] = lambda: None) -> None:
    """Run so many frames, block by block, the last one shorter; `between` is called before every block.

    In real time a block is begun when the one before it has been played; a clock that wakes up late makes up for it.
    """
    out = np.zeros((host.block, host.device.outputs), host.device.dtype)
    began, first = time.perf_counter(), host.frames
    done = 0
    while done < frames:
        between()
        now = min(host.block, frames - done)
        host.step(None, out[:now])
        done = host.frames - first
        if real_time:
            ahead = began + done / host.rate - time.perf_counter()
            if ahead > 0.0:
                time.sleep(ahead)
