"""What the instrument `response` gives."""

from dataclasses import dataclass


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
class Response:
    """deviation and leak: the worst of all outputs and bands, None where one has none; `bands` has each.

    unstable_poles: on or outside the unit circle, with the coefficients as stored, decided exactly.
    """

    deviation_db: float | None
    deviation_hz: float | None
    leak_db: float | None
    unstable_poles: int
    bands: tuple[BandDeviation, ...]
