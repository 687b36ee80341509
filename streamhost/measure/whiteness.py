"""Whether the white model holds in a run, judged by what its roundings dropped and by nothing else.

The model (Bennett 1948; Oppenheim & Schafer, ch. 6): every error is uniform over the values it can take, white, and
uncorrelated with the input and the other errors. Each bound is what one of a hundred runs of such errors would pass by
chance, all checks together, plus an allowance for what makes no difference of half a dB: a rounding's departures
count by its part in the predicted noise, octave by octave, and one with next to no part is looked at for its spectrum
alone.
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
CORRELATION = 0.05
"""Between frames it bends the spectrum by at most twice as much, between roundings it adds as much: under half a dB."""
DENSITY_SHARE = 0.12
"""Half a dB."""

LEAST_SHARE = 0.05

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
    shares: tuple[float, ...] = (1.0,) * OCTAVES
    """Its part in the predicted noise of all roundings, by octave from the lowest up."""

    @property
    def matters(self) -> bool:
        """Whether half again as much of it would be a tenth of a dB of the noise."""
        return sum(self.shares) >= LEAST_SHARE


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

    @property
    def that_matter(self) -> list[tuple[int, Expected]]:
        """Roundings with a part in the noise, with their place."""
        return [(k, rounding) for k, rounding in enumerate(self.expected) if rounding.matters]

    @cached_property
    def sigmas(self) -> float:
        return NormalDist().inv_cdf(1.0 - self.chance / 2.0)

    @cached_property
    def scatter(self) -> float:
        """Of a mean of independent values of variance 1, as many sigmas as are allowed."""
        return self.sigmas / sqrt(self.residues.frames)

    def moments(self) -> str:
        for k, rounding in self.that_matter:
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
        for k, rounding in self.that_matter:
            continuous = abs(12.0 * rounding.variance - 1.0) < UNIFORM_VARIANCE_SHARE
            if rounding.dithered or not continuous:
                continue
            distance = np.abs(np.cumsum(self.residues.histogram[k]) - np.arange(1, BINS + 1) / BINS).max()
            if distance > DISTRIBUTION_SHARE + self.scatter / 2.0:
                return f"what {rounding.label} drops is not uniform"
        return ""

    def density(self) -> str:
        """The power that roundings put into octaves beyond what chance explains, by its part in the noise."""
        for k, rounding in self.that_matter:
            if abs(self.beyond(self.residues.drift[k], self.residues.drift_degrees)) > DENSITY_SHARE:
                return f"the mean of what {rounding.label} drops drifts"
        excess = np.array([[self.beyond(self.residues.octaves[octave, k], degrees) for k in range(len(self.expected))]
                           for octave, degrees in enumerate(self.residues.octave_degrees)])
        weighted = excess * np.array([rounding.shares for rounding in self.expected]).T
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
        allowed = CORRELATION + self.scatter
        to_input, between = self.residues.to_input.copy(), self.residues.correlation
        if (beyond := np.argwhere(np.abs(to_input) > allowed)).size:
            return f"what {self.expected[beyond[0][1]].label} drops follows the input"
        count = len(self.expected)
        own = np.zeros_like(between, dtype=np.bool_)
        own[0][np.diag_indices(count)] = True
        idle = [k for k in range(count) if not self.expected[k].matters]
        own[:, idle], own[:, :, idle], to_input[:, idle] = True, True, 0.0
        if not (beyond := np.argwhere((np.abs(between) > allowed) & ~own)).size:
            return ""
        lag, earlier, later = beyond[0]
        if earlier == later:
            frames = "1 frame" if lag == 1 else f"{lag} frames"
            return f"what {self.expected[later].label} drops is correlated with what it dropped {frames} before"
        return f"what {self.expected[earlier].label} and {self.expected[later].label} drop is correlated"
