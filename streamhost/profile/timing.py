"""The method of timing: pinned, warmed up, interleaved, corrected by calibration.

Every round times a few blocks of every lane at every block length, the lanes right after each other and in an order that
turns from round to round; before and after each of them two loops tell how fast the processor runs and whether the core is
shared. A round's figure is the mean of the middle half of its blocks (a clock may count in steps of 10 ns or more), brought to
the speed that the processor had in the middle of the whole run. Rounds in which the core was shared count only where too few
are left, and then the least shared do; up to five times as many rounds are made to find enough. What is told is the median of
those that count.

Worst block and 99.9 percentile are of all blocks, as they came: on a machine that does other work they tell of that as well.
"""

import gc
import os
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, field
from statistics import median, quantiles
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from streamhost.profile.driver import Lane, Speed, middle_mean

BLOCKS = (16, 32, 64, 128, 256, 512, 1024, 2048, 4096)
TAIL_BLOCK = 64
ROUNDS, QUICK_ROUNDS = 21, 7
MORE_ROUNDS = 5
BLOCKS_A_ROUND = 50
ENOUGH, LEAST = 7, 3
ALONE = 1.08
"""Up to so many times the least crowding a core counts as not shared: the loop scatters less, a neighbour makes it far more."""

Report = Callable[[float, str], None]


class Timer(Protocol):
    """What times: the machine, or a clock made for a test."""

    def calibrate(self) -> Speed:
        """How fast the processor is now."""

    def block_times(self, lane: Lane, frames: int, blocks: int, *, tail: bool = False) -> NDArray[np.float64]:
        """Nanoseconds of each of so many blocks."""


@dataclass(frozen=True)
class Sample:
    """What a round found for one lane at one block length. chain: ns a step around it; crowding: the worse of the two, and the
    least of all short runs in them."""

    ns_per_frame: float
    chain: float
    crowding: float
    least_crowding: float
    blocks: NDArray[np.float64]


Key = tuple[int, int, bool]
"""Which lane, how many frames a block, whether it is the tail."""


@dataclass
class Times:
    """All samples by key, in the order of rounds."""

    samples: dict[Key, list[Sample]] = field(default_factory=dict)

    @property
    def rounds(self) -> int:
        return max(map(len, self.samples.values()), default=0)

    @property
    def chain(self) -> float:
        """Nanoseconds of a step of the chain, in the middle of the run."""
        return median(sample.chain for sample in self._all())

    @property
    def drift_percent(self) -> float:
        """How far 95 % of the chain's readings stayed to that."""
        return 100.0 * float(np.percentile([abs(sample.chain / self.chain - 1.0) for sample in self._all()], 95.0))

    @property
    def shared_percent(self) -> float:
        """How many of all samples found the core shared."""
        limit = self.alone()
        shared = [sample.crowding > limit for sample in self._all()]
        return 100.0 * sum(shared) / len(shared)

    def alone(self) -> float:
        """The crowding up to which a core counts as not shared."""
        return ALONE * float(np.percentile([sample.least_crowding for sample in self._all()], 1.0))

    def enough(self) -> bool:
        """Whether every series has enough samples of a core that was not shared."""
        return min(self._alone_counts(), default=0) >= ENOUGH

    @property
    def doubtful_percent(self) -> float:
        """How many of all series have so few of these that samples of a shared core had to count."""
        counts = self._alone_counts()
        return 100.0 * sum(count < LEAST for count in counts) / len(counts)

    def _alone_counts(self) -> list[int]:
        limit = self.alone()
        return [sum(sample.crowding <= limit for sample in each) for each in self.samples.values()]

    def counted(self, key: Key) -> list[float]:
        """Nanoseconds a frame in the rounds that count, at the speed in the middle of the run."""
        limit, chain = self.alone(), self.chain
        least_first = sorted(self.samples[key], key=lambda sample: sample.crowding)
        alone = sum(sample.crowding <= limit for sample in least_first)
        return [sample.ns_per_frame * chain / sample.chain for sample in least_first[: max(alone, LEAST)]]

    def blocks(self, key: Key) -> NDArray[np.float64]:
        """Nanoseconds of every block, ascending, as they came."""
        return np.sort(np.concatenate([sample.blocks for sample in self.samples[key]]))

    def _all(self) -> list[Sample]:
        return [sample for each in self.samples.values() for sample in each]


def spread_percent(values: Sequence[float]) -> float:
    """Half of what the middle half spans, of the median."""
    lower, middle, upper = quantiles(values, n=4, method="inclusive")
    return 50.0 * (upper - lower) / middle if middle else 0.0


def timed(lanes: Sequence[Lane], tails: Sequence[bool], timer: Timer, rounds: int, report: Report) -> Times:
    """All lanes at all block lengths; `tails`: for which lanes the decaying tail is timed too."""
    keys = [(lane, frames, False) for frames in BLOCKS for lane in range(len(lanes))]
    keys += [(lane, TAIL_BLOCK, True) for lane, tail in enumerate(tails) if tail]
    for key in keys:
        _blocks(lanes, key, timer)
    times = Times({key: [] for key in keys})
    for done in range(MORE_ROUNDS * rounds):
        if done >= rounds and times.enough():
            break
        report(min(done / rounds, 1.0), f"round {done + 1} of {rounds}" if done < rounds else "more rounds: the core is shared")
        _round(lanes, sorted(keys, key=lambda key: (*key[1:], (key[0] + done) % len(lanes))), timer, times)
    return times


def _round(lanes: Sequence[Lane], keys: Sequence[Key], timer: Timer, times: Times) -> None:
    before = timer.calibrate()
    for key in keys:
        blocks = _blocks(lanes, key, timer)
        after = timer.calibrate()
        times.samples[key].append(Sample(
            middle_mean(blocks) / key[1], (before.chain + after.chain) / 2, max(before.crowding, after.crowding),
            min(before.least_crowding, after.least_crowding), blocks,
        ))
        before = after


def _blocks(lanes: Sequence[Lane], key: Key, timer: Timer) -> NDArray[np.float64]:
    lane, frames, tail = key
    return timer.block_times(lanes[lane], frames, BLOCKS_A_ROUND, tail=tail)


@contextmanager
def undisturbed() -> Iterator[int | None]:
    """Pinned to one processor where the system allows it, and without Python's collector; gives the processor's number."""
    collecting = gc.isenabled()
    gc.disable()
    allowed = os.sched_getaffinity(0) if hasattr(os, "sched_getaffinity") else set()
    pinned = max(allowed, default=None)
    try:
        if pinned is not None:
            try:
                os.sched_setaffinity(0, {pinned})
            except OSError:
                pinned = None
        yield pinned
    finally:
        if pinned is not None:
            os.sched_setaffinity(0, allowed)
        if collecting:
            gc.enable()
