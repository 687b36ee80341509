"""What the instrument `response` gives. A z is told by its parts `_real` and `_imaginary`, lengths in the z plane too.

Of a conjugate pair the upper one speaks for both.
"""

from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

CURVE: Any = {"curve": True}


@dataclass(frozen=True)
class BandDeviation:
    """At an output, or for the sum of all (`output` is "sum"), over a band; None with the `reason` where there is none.

    deviation: the largest |20 lg(|H rounded| / |H asked|)| where |H asked| is within 40 dB of its maximum in the band, and
    where. leak_db: the largest |H rounded| where it is not, relative to that maximum; None where it is everywhere.
    """

    output: str
    low_hz: float
    high_hz: float
    deviation_db: float | None
    deviation_hz: float | None
    leak_db: float | None
    reason: str


@dataclass(frozen=True)
class Step:
    """How a pole moves with a coefficient: dp/dc (J. F. Kaiser, 1965), and how far with one step of it as stored."""

    coefficient: str
    derivative_real: float
    derivative_imaginary: float
    step: float
    moves: float
    moves_hz: float


@dataclass(frozen=True)
class Root:
    """A pole or a zero as asked and with the coefficients as stored; either is None where the other has no partner.

    radius and hz: of the stored one. moved: how far it is from the one that was asked for. steps: of a pole, its distance
    from the poles that one step of each coefficient gives, to the first order.
    """

    asked_real: float | None
    asked_imaginary: float | None
    stored_real: float | None
    stored_imaginary: float | None
    radius: float | None
    hz: float | None
    moved: float | None
    steps: tuple[Step, ...] = ()


@dataclass(frozen=True)
class Stability:
    """By the lattice test (Schur and Cohn) on exact numbers. verdict: "stable", "marginal" (poles on the circle, none
    outside) or "unstable".

    cancelled: poles on the circle of running sums that lose nothing, which zeros cancel exactly; they do no harm and do not
    count. largest_reflection: the largest |k| of all loops, None where there is no loop. largest_radius: of the poles, None
    without poles.
    """

    verdict: str
    on_circle: int
    outside: int
    cancelled: int
    largest_reflection: float | None
    largest_radius: float | None


@dataclass(frozen=True)
class OutputResponse:
    """Of one output. None where there is no response, or, of a delay, none that could be told.

    latency: the group delay averaged over the power that the response passes, which is where the energy of the impulse
    response lies. onset_frames: before them the impulse response is 0. group_delay and phase: where |H asked| is within
    40 dB of its maximum in the first band: the least and the most delay as stored, and how far delay and phase are at most
    from what was asked.

    Curves: hertz (points,); asked and stored, H at those; their group delays in frames.
    """

    output: str
    latency_frames: float | None
    latency_ms: float | None
    onset_frames: int | None
    group_delay_least_frames: float | None
    group_delay_most_frames: float | None
    group_delay_deviation_frames: float | None
    phase_deviation_degrees: float | None
    zeros: tuple[Root, ...]
    zeros_reason: str
    hertz: NDArray[np.float64] = field(metadata=CURVE, compare=False, repr=False)
    asked: NDArray[np.complex128] = field(metadata=CURVE, compare=False, repr=False)
    stored: NDArray[np.complex128] = field(metadata=CURVE, compare=False, repr=False)
    asked_delay_frames: NDArray[np.float64] = field(metadata=CURVE, compare=False, repr=False)
    stored_delay_frames: NDArray[np.float64] = field(metadata=CURVE, compare=False, repr=False)


@dataclass(frozen=True)
class MaskMargin:
    """How far inside the mask of a standard a response is where it is nearest to its edge, negative outside of it.

    nominal_hz: the mid-band of a band filter. None with the `reason` where it cannot be told. beyond_hz: from there on the
    mask cannot be judged, half the rate.
    """

    mask: str
    output: str
    nominal_hz: float | None
    margin_db: float | None
    margin_hz: float | None
    beyond_hz: float
    source: str
    reason: str


@dataclass(frozen=True)
class Response:
    """deviation and leak: the worst of all outputs and bands, None where one has none; `bands` has each.

    Where channels have coefficients of their own, `bands` tells of the worst of them, and the rest of `channel`, from 1.
    """

    deviation_db: float | None
    deviation_hz: float | None
    leak_db: float | None
    stability: Stability
    bands: tuple[BandDeviation, ...]
    masks: tuple[MaskMargin, ...]
    outputs: tuple[OutputResponse, ...]
    poles: tuple[Root, ...]
    poles_reason: str
    channel: int | None
