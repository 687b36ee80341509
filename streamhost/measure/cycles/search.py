"""Where states end up that go on by themselves: each of a batch is followed until it comes back to where it was."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from streamhost.program.native.batches import Batch, Found

Integers = NDArray[np.int64]

FIRST_STRETCH, LONGEST_CALL = 64, 1 << 13
STEPS_AT_ONCE = 1 << 27
"""Steps between two reports."""


@dataclass(frozen=True, eq=False)
class Landed:
    """Where each lane ended: a state of its cycle, (states, lanes), and what was seen in one period of it.

    `frames`: at which the period was known. Where the period is 0 no cycle was found in the steps that were allowed.
    """

    states: Integers
    found: Found
    frames: Integers
    steps: int
    complete: bool


def follow(batch: Batch, states: Integers, inputs: Integers, most_steps: int, report: Callable[[float], None]) -> Landed:
    """Follow states until they come back, in at most so many steps of all lanes together.

    Each is compared with what it was at frames 0, 64, 192, 448, ...: the first of these that lies on the cycle, with a
    stretch behind it as long as the period, gives the period exactly (R. P. Brent, BIT 20, 1980).
    """
    walk = _Walk(batch, states, inputs, most_steps, report)
    try:
        walk.run()
    except KeyboardInterrupt:
        walk.complete = False
    return Landed(walk.states, walk.found, walk.frames, walk.steps, walk.complete)


class _Walk:
    """The lanes that are still under way, and what was found of the others."""

    def __init__(self, batch: Batch, states: Integers, inputs: Integers, most_steps: int, report: Callable[[float], None]
                 ) -> None:
        self.batch, self.inputs, self.most, self.report = batch, inputs, most_steps, report
        self.states = states.copy()
        self.found = batch.nothing(states.shape[1])
        self.frames = np.zeros(states.shape[1], np.int64)
        self.active = np.arange(states.shape[1])
        self.now, self.steps, self.frame, self.complete = states.copy(), 0, 0, True

    def run(self) -> None:
        length = FIRST_STRETCH
        while len(self.active) and self.steps < self.most:
            self.stretch(length)
            length *= 2

    def stretch(self, length: int) -> None:
        """So many frames from one reference."""
        reference, found, before = self.now.copy(), self.batch.nothing(len(self.active)), 0
        while before < length and len(self.active) and self.steps < self.most:
            self.report(min(1.0, self.steps / self.most))
            frames = max(1, min(length - before, LONGEST_CALL, STEPS_AT_ONCE // len(self.active)))
            inputs = self.inputs[self.active]
            self.now, found = self.batch.watch(self.now, inputs, reference, found, frames, before)
            before, self.frame = before + frames, self.frame + frames
            self.steps += frames * len(self.active)
            still = self.put_away(reference, found)
            reference, found = np.ascontiguousarray(reference[:, still]), found.at(still)

    def put_away(self, reference: Integers, found: Found) -> NDArray[np.bool_]:
        """Keep what came back; which lanes are still under way."""
        back = found.period > 0
        lanes = self.active[back]
        if len(lanes):
            self.states[:, lanes] = reference[:, back]
            self.frames[lanes] = self.frame
            self.found.period[lanes], self.found.lost[lanes] = found.period[back], found.lost[back]
            self.found.high[:, lanes], self.found.low[:, lanes] = found.high[:, back], found.low[:, back]
            self.active, self.now = self.active[~back], np.ascontiguousarray(self.now[:, ~back])
        return ~back
