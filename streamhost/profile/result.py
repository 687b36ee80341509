"""What a profile says. Field names are the keys in JSON; a figure that is not given is None."""

from dataclasses import dataclass

from streamhost.profile.cores import Estimate
from streamhost.profile.operations import Work


@dataclass(frozen=True)
class BlockTime:
    """One block length: nanoseconds a frame (median; spread: half the span of the middle half of the rounds that count), the
    share of the block's deadline, how many such lanes fill one core, 99.9 % of the blocks and the worst as they came, and how
    many times the cheapest realization's cost."""

    block_frames: int
    ns_per_frame: float
    spread_percent: float
    deadline_percent: float
    lanes_per_core: float
    deadline_us: float
    p999_block_us: float
    worst_block_us: float
    times_cheapest: float


@dataclass(frozen=True)
class TailTime:
    """Blocks of silence from subnormal states, and how many times the cost of blocks of noise of that length."""

    block_frames: int
    ns_per_frame: float
    spread_percent: float
    times_normal: float


@dataclass(frozen=True)
class Timing:
    """One number of channels. `width`: how many of them the kernel runs at once. `tail`: None in fixed point."""

    channels: int
    width: int
    blocks: tuple[BlockTime, ...]
    tail: TailTime | None
    instructions_per_frame: float | None
    cycles_per_frame: float | None


@dataclass(frozen=True)
class Bounds:
    """What a frame of one channel cannot be faster than, in cycles of the stated table.

    loop: around the slowest loop, per frame; way: from a sample in to its output; busy: to begin all its operations. `rules`:
    "loop" or "operations", whichever is larger. `loop_path`: the labels of that loop's nodes, in the direction of flow.
    bound_ns and measured_cycles: at this machine's clock as calibrated; the latter of one channel, None where none was timed.
    """

    loop_cycles: float
    way_cycles: float
    busy_cycles: float
    rules: str
    loop_path: tuple[str, ...]
    bound_ns: float
    measured_cycles: float | None


@dataclass(frozen=True)
class Profiled:
    """One realization: what it does a frame and channel, its bounds, its times, what it would cost on the user's core."""

    work: Work
    bounds: Bounds
    timings: tuple[Timing, ...]
    estimate: Estimate | None


@dataclass(frozen=True)
class Method:
    """How it was timed. clock_ghz: by the calibration chain. drift_percent: how far 95 % of its readings stayed to the median.

    shared_percent: the samples in which something else ran on the core, which count only where too few others are left;
    doubtful_percent: the figures that are made of such.
    no_counters: why the host counts neither instructions nor cycles, or None where it does.
    """

    rounds: int
    blocks_a_round: int
    pinned_to: int | None
    clock_ghz: float
    drift_percent: float
    shared_percent: float
    doubtful_percent: float
    no_counters: str | None


@dataclass(frozen=True)
class Profile:
    """All realizations, timed together."""

    method: Method
    realizations: tuple[Profiled, ...]
