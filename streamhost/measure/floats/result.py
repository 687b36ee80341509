"""What the instrument `float_particulars` gives."""

from dataclasses import dataclass, field


@dataclass(frozen=True)
class TailState:
    """A delay after the signal has ended: its first frame with a subnormal value, and in how many it holds one.

    last_steps: what it held in the last frame that was watched, in multiples of the smallest subnormal.
    """

    state: str
    first_frame: int | None
    subnormal_frames: int
    last_steps: float


@dataclass(frozen=True)
class Tail:
    """What follows uniform white noise of signal_s, its peak signal_peak_dbfs; frames count from its end.

    first_frame, subnormal_frames: in which any state is subnormal, None and 0 without. watched_frames: looked at.
    ended_frame: from there on every state is 0, None where that was not seen. for_ever: the states repeat with
    period_frames and are subnormal; None where neither an end nor a repetition was seen. The two times are timings on this
    machine, not the same from run to run: of a frame of the tail, and of one of the noise; None with too short a tail.
    """

    signal_s: float
    signal_peak_dbfs: float
    seed: int
    first_frame: int | None
    subnormal_frames: int
    watched_frames: int
    ended_frame: int | None
    for_ever: bool | None
    period_frames: int | None
    states: tuple[TailState, ...]
    tail_ns_per_frame: float | None = field(default=None, compare=False)
    normal_ns_per_frame: float | None = field(default=None, compare=False)


@dataclass(frozen=True)
class Drift:
    """Of an output's error, realized minus ideal, on that noise, where running sums lose what rounding drops.

    found and predicted: the rms of what it moves in a second, 1.0 = 0 dBFS; a random walk moves as the root of the time.
    predicted: by the estimate for each rounding. at_end: where it was after duration_s.
    """

    output: str
    duration_s: float
    found_after_1_s_dbfs: float
    predicted_after_1_s_dbfs: float
    at_end_dbfs: float


@dataclass(frozen=True)
class LostBits:
    """A sum in which what comes of the input without delay meets something larger.

    largest and input: the peaks, on that noise, of the largest of its terms and results, and of the smallest term that the
    input reaches without a delay. lost_bits: by so many bits the latter is shifted out of the mantissa, when both peak.
    """

    sum: str
    largest_dbfs: float
    input_dbfs: float
    lost_bits: float
    mantissa_bits: int


@dataclass(frozen=True)
class FloatParticulars:
    """Nothing of it applies to fixed point: all None or empty, with the `reason`.

    drift_reason: why there is none. lost_bits: the most of `sums`, which come with the most first. noise_is_estimate: what
    the instrument `noise` predicts in floating point is one.
    """

    applies: bool
    reason: str
    type: str | None = None
    sum_type: str | None = None
    unit_roundoff: float | None = None
    smallest_normal: float | None = None
    smallest_subnormal: float | None = None
    largest_exact_integer: int | None = None
    flush_subnormals: bool | None = None
    tail: Tail | None = None
    drift: tuple[Drift, ...] = ()
    drift_reason: str = ""
    lost_bits: float | None = None
    sums: tuple[LostBits, ...] = ()
    noise_is_estimate: bool | None = None
    complete: bool = True
