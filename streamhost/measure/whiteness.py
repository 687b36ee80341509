"""Whether the white model holds in a run, judged by what its roundings dropped and by nothing else.

The model (Bennett 1948; Oppenheim & Schafer, ch. 6): every error is uniform over the values it can take, white, and
uncorrelated with the input and the other errors. Each bound is what one of a hundred runs of such errors would pass by
chance, all checks together, plus an allowance for what makes no difference of half a dB.
"""

from dataclasses import dataclass
from functools import cached_property
from math import sqrt
from statistics import NormalDist

import numpy as np

from streamhost.measure.residues import BINS, LAGS, OCTAVES, Residues

CHANCE = 0.01
LEAST_FRAMES = 4096

MEAN_STEPS = 0.01
VARIANCE_SHARE = 0.05
DISTRIBUTION_SHARE = 0.05
"""Ten values evenly apart pass, two do not: noise power knows no more of a distribution than its moments."""
CORRELATION = 0.01
DENSITY_SHARE = 0.12
"""Half a dB."""

UNIFORM_VARIANCE_SHARE = 4.0**-5
"""A rounding that drops some six bits or more has a variance this near to that of a continuous error."""


@dataclass(frozen=True)
class Whiteness:
    """`holds`: whether the white model does; None where that cannot be told. `reason`: a clause that says why not."""

    holds: bool | None
    reason: str = ""


@dataclass(frozen=True)
class Expected:
    """What the model says of the residues of one rounding, in steps; `lowest` is the least of them."""

    label: str
    mean: float
    variance: float
    lowest: float
    dithered: bool


def judged(expected: tuple[Expected, ...], residues: Residues | None) -> Whiteness:
    """The verdict on the residues of roundings, in their order; None without a run that is long enough."""
    if residues is None or residues.frames < LEAST_FRAMES:
        return Whiteness(None, f"the run has fewer than {LEAST_FRAMES} whole frames after the settling time")
    judge = _Judge(expected, residues)
    reasons = (check() for check in (judge.moments, judge.distribution, judge.density, judge.correlations))
    return next((Whiteness(False, reason) for reason in reasons if reason), Whiteness(True))


@dataclass(frozen=True)
class _Judge:
    """Every check gives the reason for which it fails, or an empty text."""

    expected: tuple[Expected, ...]
    residues: Residues

    @cached_property
    def chance(self) -> float:
        """What a single check may pass by chance."""
        count = len(self.expected)
        return CHANCE / (count * (4 + OCTAVES + (LAGS + 1) * (count + 1)))

    @cached_property
    def sigmas(self) -> float:
        return NormalDist().inv_cdf(1.0 - self.chance / 2.0)

    @cached_property
    def scatter(self) -> float:
        """Of a mean of independent values of variance 1, as many sigmas as are allowed."""
        return self.sigmas / sqrt(self.residues.frames)

    def moments(self) -> str:
        for k, rounding in enumerate(self.expected):
            mean, variance = float(self.residues.mean[k]), float(self.residues.variance[k])
            # the square of a uniform variable scatters by root 0.8 of its mean
            if abs(variance / rounding.variance - 1.0) > VARIANCE_SHARE + self.scatter * sqrt(0.8):
                return (f"{rounding.label} drops values of variance {variance:.3g} steps squared, "
                        f"not {rounding.variance:.3g}")
            if abs(mean - rounding.mean) > MEAN_STEPS + self.scatter * sqrt(rounding.variance):
                return f"{rounding.label} drops {mean:.3f} of a step in the mean, not {rounding.mean:.3f}"
        return ""

    def distribution(self) -> str:
        """By the largest distance between cumulative distributions (Kolmogorov and Smirnov)."""
        for k, rounding in enumerate(self.expected):
            continuous = abs(12.0 * rounding.variance - 1.0) < UNIFORM_VARIANCE_SHARE
            if rounding.dithered or not continuous:
                continue
            distance = np.abs(np.cumsum(self.residues.histogram[k]) - np.arange(1, BINS + 1) / BINS).max()
            if distance > DISTRIBUTION_SHARE + self.scatter / 2.0:
                return f"what {rounding.label} drops is not uniform"
        return ""

    def density(self) -> str:
        for k, rounding in enumerate(self.expected):
            if not self.as_white(self.residues.drift[k], self.residues.drift_degrees):
                return f"the mean of what {rounding.label} drops drifts"
            for octave, degrees in enumerate(self.residues.octave_degrees):
                if not self.as_white(self.residues.octaves[octave, k], degrees):
                    where = f"{OCTAVES - octave} octaves below half the rate" if octave else "at the lowest frequencies"
                    return f"what {rounding.label} drops is not white {where}"
        return ""

    def as_white(self, ratio: float, degrees: float) -> bool:
        """Whether a power over the expected one is what a chi-square variable of those degrees may show."""
        from scipy.special import chdtri

        low, high = (float(chdtri(degrees, p)) / degrees for p in (1.0 - self.chance / 2.0, self.chance / 2.0))
        return low - DENSITY_SHARE <= ratio <= high + DENSITY_SHARE

    def correlations(self) -> str:
        allowed = CORRELATION + self.scatter
        to_input, between = self.residues.to_input, self.residues.correlation
        if (beyond := np.argwhere(np.abs(to_input) > allowed)).size:
            return f"what {self.expected[beyond[0][1]].label} drops follows the input"
        own = np.zeros_like(between, dtype=np.bool_)
        own[0][np.diag_indices(len(self.expected))] = True
        if not (beyond := np.argwhere((np.abs(between) > allowed) & ~own)).size:
            return ""
        lag, earlier, later = beyond[0]
        if earlier == later:
            return f"what {self.expected[later].label} drops is correlated with what it dropped {lag} frames before"
        return f"what {self.expected[earlier].label} and {self.expected[later].label} drop is correlated"
