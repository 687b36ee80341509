"""What a run says of itself, read from the shared records: block times against the deadline, lanes, changes."""

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from streamhost.host.plan import Changed
from streamhost.host.records import BINS, BINS_PER_OCTAVE, REASONS, STATES
from streamhost.host.shared import Shared


@dataclass(frozen=True)
class LaneFigures:
    """Of one lane since the run began. `load_percent`: the time it takes of the time that its frames last."""

    peak_dbfs: float
    rms_dbfs: float
    saturations: int
    wraps: int
    accumulator_overflows: int
    not_a_number: int
    load_percent: float


@dataclass(frozen=True)
class GuardFigures:
    """Its state, and the reason, frame and lane where it has shut; `held`: samples that the ceiling held."""

    state: str
    reason: str
    frame: int
    lane: int
    held: int
    gain_db: float


def lane_figures(shared: Shared, lane: int, columns: int, rate: float) -> LaneFigures:
    """Of one lane, whose output has so many columns."""
    meters = shared.lanes[lane]
    frames = int(meters["samples"]) // columns
    samples = frames * columns - int(meters["not_a_number"])
    rms = 2.0 * float(meters["sum_of_squares"]) / samples if samples else 0.0
    return LaneFigures(
        decibels(float(meters["peak"])), decibels(math.sqrt(rms)), int(meters["saturations"]), int(meters["wraps"]),
        int(meters["accumulator_overflows"]), int(meters["not_a_number"]),
        float(meters["nanoseconds"]) * rate / (1e7 * frames) if frames else 0.0,
    )


def guard_figures(shared: Shared, begins: int = 0) -> GuardFigures:
    """Of the monitor's path."""
    meters = shared.meters[0]
    return GuardFigures(STATES[meters["state"]], REASONS[meters["reason"]], int(meters["reason_frame"]) - begins,
                        int(meters["reason_lane"]), int(meters["held"]), decibels(float(meters["gain"])))


def run_figures(shared: Shared, block: int, rate: float) -> dict[str, object]:
    """Blocks, gaps and block times in microseconds, by the keys that scripts read.

    Percentiles are upper ends of bins, 32 an octave: at most 3 % too large.
    """
    meters = shared.meters[0]
    longest = int(meters["longest_nanoseconds"]) / 1e3
    half, nearly_all = (min(percentile_ns(shared.histogram, share) / 1e3, longest) for share in (0.5, 0.999))
    return {
        "blocks": int(meters["callbacks"]), "output_gaps": int(meters["output_gaps"]), "input_gaps": int(meters["input_gaps"]),
        "block_frames": block, "deadline_us": block / rate * 1e6,
        "step_p50_us": half, "step_p999_us": nearly_all, "step_max_us": longest,
        "blocks_over_half": int(meters["blocks_over_half"]),
    }


def percentile_ns(histogram: NDArray[np.int64], share: float) -> float:
    """The upper end of the bin in which that share of all blocks is reached; 0 of none."""
    total = int(histogram.sum())
    if not total:
        return 0.0
    return float(bin_ends_ns()[np.searchsorted(np.cumsum(histogram), math.ceil(share * total))])


def bin_ends_ns() -> NDArray[np.float64]:
    """The upper ends of the histogram's bins."""
    place = np.arange(BINS)
    octave = np.maximum(place // BINS_PER_OCTAVE - 1, 0)
    return np.asarray((place - octave * BINS_PER_OCTAVE + 1) * 2.0**octave, np.float64)


def change_figures(changes: Sequence[Changed]) -> list[dict[str, object]]:
    """Each change as scripts read it; lanes are counted from 1."""
    return [{"frame": each.frame, "lane": each.lane + 1, "before": each.before + 1, "changeover": each.changeover,
             "states_clipped": each.clipped} for each in changes]


def decibels(value: float) -> float:
    """20 log10, minus infinity of 0."""
    return 20.0 * math.log10(value) if value > 0.0 else -math.inf
