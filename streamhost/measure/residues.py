"""What a run's roundings really dropped, summed up block after block.

Residues are before minus after, in steps of the register that the rounding makes, as a traced kernel writes them.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from streamhost.measure.bands import bin_shares

FloatArray = NDArray[np.float64]

LAGS = 8
BINS = 16
OCTAVES = 11
"""Octaves from half the rate down that are looked at; the last takes all that lies below."""


@dataclass(frozen=True, eq=False)
class Residues:
    """Of n frames (all channels together) and s roundings.

    mean, variance: (s,). histogram: shares of BINS equal parts of a step, from the lowest value that the rounding can
    drop, (s, BINS). correlation: between the roundings, [lag, earlier, later] for lags 0 to LAGS, (LAGS + 1, s, s).
    to_input: between the input and each rounding, lags 0 to LAGS, (LAGS + 1, s). octaves: power density by octave from
    the lowest up over that of all, (OCTAVES, s); octave_degrees: chi-square degrees of freedom of each, (OCTAVES,).
    drift: variance of the blocks' means over what independent residues would show, (s,), of drift_degrees.
    """

    frames: int
    mean: FloatArray
    variance: FloatArray
    histogram: FloatArray
    correlation: FloatArray
    to_input: FloatArray
    octaves: FloatArray
    octave_degrees: FloatArray
    drift: FloatArray
    drift_degrees: int

    def only(self, kept: Sequence[int]) -> "Residues":
        """Those of some of the roundings."""
        return Residues(
            self.frames, self.mean[kept], self.variance[kept], self.histogram[kept], self.correlation[:, kept][:, :, kept],
            self.to_input[:, kept], self.octaves[:, kept], self.octave_degrees, self.drift[kept], self.drift_degrees,
        )


class ResidueSum:
    """Sums of residues over blocks that need not adjoin; `lowest` is the least residue of each rounding, (s,)."""

    def __init__(self, lowest: FloatArray) -> None:
        count = len(lowest)
        self._lowest = lowest
        self._frames = 0
        self._sum, self._histogram = np.zeros(count + 1), np.zeros((count, BINS))
        self._products = np.zeros((LAGS + 1, count + 1, count + 1))
        self._pairs = np.zeros(LAGS + 1)
        self._octaves, self._degrees = np.zeros((OCTAVES, count)), np.zeros(OCTAVES)
        self._means: list[FloatArray] = []
        self._lengths: list[int] = []

    def add(self, x: FloatArray, residues: FloatArray) -> None:
        """One channel of a block: the input (frames,), more than LAGS of them, and the residues (frames, s)."""
        values = np.column_stack((residues, x))
        self._frames += len(values)
        self._sum += values.sum(axis=0)
        self._means.append(residues.mean(axis=0))
        self._lengths.append(len(residues))
        for lag in range(LAGS + 1):
            self._products[lag] += values[: len(values) - lag].T @ values[lag:]
            self._pairs[lag] += len(values) - lag
        part = np.clip((residues - self._lowest) * BINS, 0, BINS - 1).astype(np.int64)
        for k in range(len(self._lowest)):
            self._histogram[k] += np.bincount(part[:, k], minlength=BINS)
        self._add_octaves(residues)

    def _add_octaves(self, residues: FloatArray) -> None:
        window = np.hanning(len(residues) + 1)[:-1, None]
        power = np.abs(np.fft.rfft((residues - residues.mean(axis=0)) * window, axis=0)) ** 2
        power[1:-1] *= 2.0
        edges = octave_edges(len(power))
        for octave, (low, high) in enumerate(pairwise(edges)):
            shares = bin_shares(len(power), 1.0, (low, high))
            self._octaves[octave] += shares @ power / (high - low)
            self._degrees[octave] += 2.0 * (high - low) * HANN_SHARE

    def result(self) -> Residues:
        """Everything that was added; at least one block."""
        mean = self._sum / self._frames
        covariance = self._products / self._pairs[:, None, None] - np.outer(mean, mean)
        variance = np.maximum(np.diag(covariance[0]), 0.0)
        scale = np.sqrt(np.outer(variance, variance))
        correlation = np.divide(covariance, scale, out=np.zeros_like(covariance), where=scale > 0.0)
        widths = np.diff(octave_edges(2))[:, None]
        whole = (self._octaves * widths).sum(axis=0) / widths.sum()
        octaves = np.divide(self._octaves, whole, out=np.zeros_like(self._octaves), where=whole > 0.0)
        return Residues(
            self._frames, mean[:-1], variance[:-1], self._histogram / self._frames, correlation[:, :-1, :-1],
            correlation[:, -1, :-1], octaves, self._degrees, *self._drift(mean[:-1], variance[:-1]),
        )

    def _drift(self, mean: FloatArray, variance: FloatArray) -> tuple[FloatArray, int]:
        degrees = max(1, len(self._means) - 1)
        scatter = np.array(self._lengths) @ (np.array(self._means) - mean) ** 2 / degrees
        return np.divide(scatter, variance, out=np.zeros_like(variance), where=variance > 0.0), degrees


HANN_SHARE = 18.0 / 35.0
"""Of a block's frames, how many a Hann window leaves to tell power from: (sum w^2)^2 / (n sum w^4)."""


def octave_edges(bins: int) -> FloatArray:
    """Edges in bins of a spectrum from 0 to half the rate: 0, then octaves up to the last bin."""
    return np.concatenate(([0.0], (bins - 1) * 2.0 ** -np.arange(OCTAVES - 1.0, -1.0, -1.0)))
