"""Whether the white model holds in a run, judged by what its roundings dropped and by nothing else.

The model (Bennett 1948; Oppenheim & Schafer, ch. 6): every error is uniform over the values it can take, white, and
uncorrelated with the input and the other errors. Each bound is what one of a hundred runs of such errors would pass by
chance, all checks together. What departures are beyond it count by the roundings' parts in the predicted noise, that of the
spectrum octave by octave, and are added up over all roundings: as little as makes no difference of 0.3 dB is allowed.
"""

from dataclasses import dataclass
from functools import cached_property
from math import sqrt
from statistics import NormalDist

import numpy as np
from numpy.typing import NDArray

from streamhost.measure.residues import BINS, LAGS, OCTAVES, Residues

FloatArray = NDArray[np.float64]

CHANCE = 0.01
LEAST_FRAMES = 4096

MEAN_STEPS = 0.01
VARIANCE_SHARE = 0.05
DISTRIBUTION_SHARE = 0.05
"""Ten values evenly apart pass, two do not: noise power knows no more of a distribution than its moments."""
CORRELATION = 0.07
"""Of the noise, what correlations may add at some frequency: 0.3 dB."""
DENSITY_SHARE = 0.07
"""0.3 dB."""

LEAST_SHARE = 0.05
"""Of the predicted noise, what may come from where no residue is written down."""

UNIFORM_VARIANCE_SHARE = 4.0**-5
"""A rounding that drops some six bits or more has a variance this near to that of a continuous error."""


OF_WHITE = (2.0 ** (1 - OCTAVES), *(2.0 ** (octave - OCTAVES) for octave in range(1, OCTAVES)))
"""By octave, the shares of noise that is white where it comes out."""


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
    shares: tuple[float, ...] = OF_WHITE
    """Its part in the predicted noise of all roundings, by octave from the lowest up."""


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
    def shares(self) -> FloatArray:
        """Of each rounding in the noise of all of them, by octave, (s, OCTAVES)."""
        shares = np.array([rounding.shares for rounding in self.expected])
        return np.asarray(shares / shares.sum())

    @cached_property
    def parts(self) -> FloatArray:
        """Of each rounding in the noise of all of them, (s,)."""
        return np.asarray(self.shares.sum(axis=1))

    @cached_property
    def chance(self) -> float:
        """What a single check may pass by chance."""
        count, groups = len(self.expected), len(self.residues.correlation[0])
        return CHANCE / (count * (4 + OCTAVES + LAGS + 1) + (LAGS + 1) * groups**2)

    @cached_property
    def scatter(self) -> float:
        """Of a mean of independent values of variance 1, as much as is allowed."""
        return NormalDist().inv_cdf(1.0 - self.chance / 2.0) / sqrt(self.residues.frames)

    def moments(self) -> str:
        means, variances = np.array([(rounding.mean, rounding.variance) for rounding in self.expected]).T
        mean, variance = self.residues.mean, self.residues.variance
        # the square of a uniform variable scatters by root 0.8 of its mean
        beyond = self.parts * _beyond(variance / variances - 1.0, self.scatter * sqrt(0.8))
        if beyond.sum() > VARIANCE_SHARE:
            k = int(np.argmax(beyond))
            return f"{self.expected[k].label} drops values of variance {variance[k]:.3g} steps squared, not {variances[k]:.3g}"
        beyond = self.parts * _beyond(mean - means, self.scatter * np.sqrt(variances))
        if beyond.sum() > MEAN_STEPS:
            k = int(np.argmax(beyond))
            return f"{self.expected[k].label} drops {mean[k]:.3f} of a step in the mean, not {round(means[k], 3) + 0.0:.3f}"
        return ""

    def distribution(self) -> str:
        """By the largest distance between cumulative distributions (Kolmogorov and Smirnov)."""
        levels = np.cumsum(self.residues.histogram, axis=1) - np.arange(1, BINS + 1) / BINS
        continuous = [abs(12.0 * rounding.variance - 1.0) < UNIFORM_VARIANCE_SHARE and not rounding.dithered
                      for rounding in self.expected]
        beyond = self.parts * _beyond(np.abs(levels).max(axis=1), self.scatter / 2.0) * continuous
        if beyond.sum() > DISTRIBUTION_SHARE:
            return f"what {self.expected[int(np.argmax(beyond))].label} drops is not uniform"
        return ""

    def density(self) -> str:
        """The power that roundings put into octaves beyond what chance explains, by its part in the noise."""
        drift = self.parts * np.abs([self.beyond(each, self.residues.drift_degrees) for each in self.residues.drift])
        if drift.sum() > DENSITY_SHARE:
            return f"the mean of what {self.expected[int(np.argmax(drift))].label} drops drifts"
        excess = np.array([[self.beyond(each, degrees) for each in octave]
                           for octave, degrees in zip(self.residues.octaves, self.residues.octave_degrees, strict=True)])
        weighted = excess * self.shares.T
        if max(weighted.clip(min=0.0).sum(), -weighted.clip(max=0.0).sum()) <= DENSITY_SHARE:
            return ""
        octave, worst = divmod(int(np.argmax(np.abs(weighted))), len(self.expected))
        octaves = "1 octave" if octave == OCTAVES - 1 else f"{OCTAVES - octave} octaves"
        where = f"{octaves} below half the rate" if octave else "at the lowest frequencies"
        return f"what {self.expected[worst].label} drops is not white {where}"

    def beyond(self, ratio: float, degrees: float) -> float:
        """How far a power over the expected one is from what a chi-square variable of those degrees may show."""
        from scipy.special import chdtri

        low, high = (float(chdtri(degrees, p)) / degrees for p in (1.0 - self.chance / 2.0, self.chance / 2.0))
        return float(ratio - min(max(ratio, low), high))

    def correlations(self) -> str:
        to_input = self.parts * _beyond(self.residues.to_input, self.scatter)
        if to_input.sum(axis=1).max() > CORRELATION:
            return f"what {self.expected[int(np.argmax(to_input.max(axis=0)))].label} drops follows the input"
        between = self.residues.correlation.copy()
        groups = np.zeros(between.shape[1])
        np.add.at(groups, self.residues.groups, self.parts)
        between[0] -= np.eye(len(groups))
        allowed = np.full_like(between, self.scatter)
        allowed[0] += (sqrt(2.0) - 1.0) * self.scatter * np.eye(len(groups))  # of a square, which is a group's own variance
        beyond = _beyond(between, allowed) * np.sqrt(np.outer(groups, groups))
        beyond[1:] *= 2.0  # a lag counts backwards too
        if beyond.sum(axis=(1, 2)).max() <= CORRELATION:
            return ""
        lag, earlier, later = np.unravel_index(int(np.argmax(beyond)), beyond.shape)
        first, second = self._heaviest(int(earlier)), self._heaviest(int(later))
        if lag and earlier == later:
            frames = "1 frame" if lag == 1 else f"{lag} frames"
            return f"what {first} drops is correlated with what it dropped {frames} before"
        return f"what {first} and {second} drop is correlated"

    def _heaviest(self, group: int) -> str:
        """What a group is called: by its member with the most noise, and that there are others."""
        members = np.flatnonzero(self.residues.groups == group)
        label = self.expected[members[np.argmax(self.parts[members])]].label
        return label if len(members) == 1 else f"{label} or one of {len(members) - 1} others"


def _beyond(departure: FloatArray, scatter: FloatArray | float) -> FloatArray:
    """How much larger departures are than what chance explains."""
    return np.asarray(np.maximum(np.abs(departure) - scatter, 0.0))
