"""What a run's roundings really dropped, summed up block after block.

Residues are before minus after, in steps of the register that the rounding makes, as a traced kernel writes them.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
Singles = NDArray[np.float32]

LAGS = 8
BINS = 16
OCTAVES = 11
"""Octaves from half the rate down that are looked at; the last takes all that lies below."""

MOST_PAIRED = 64
"""Roundings up to which each is held against each other one; beyond, sums of several with random signs are."""

GROUPING_SEED = 5

SMALL_PRODUCT = 1 << 18
"""Multiplications of a matrix product that BLAS does in one thread. More threads would have to wait for each other, for
longer than the work takes where the cores are busy, and would not add in the same order everywhere."""


@dataclass(frozen=True, eq=False)
class Residues:
    """Of n frames (all channels together) and s roundings.

    mean, variance: (s,). histogram: shares of BINS equal parts of a step, from the lowest value that the rounding can
    drop, (s, BINS). groups: which of g groups each rounding is in, (s,), each in its own where there are few.
    correlation: between the sums of groups, [lag, earlier, later] for lags 0 to LAGS, (LAGS + 1, g, g), with the variances
    that uncorrelated members would give them. to_input: between the input and each rounding, lags 0 to LAGS,
    (LAGS + 1, s). octaves: power density by octave from the lowest up over that of all, (OCTAVES, s); octave_degrees:
    chi-square degrees of freedom of each, (OCTAVES,). drift: variance of the blocks' means over what independent
    residues would show, (s,), of drift_degrees.
    """

    frames: int
    mean: FloatArray
    variance: FloatArray
    histogram: FloatArray
    groups: NDArray[np.intp]
    correlation: FloatArray
    to_input: FloatArray
    octaves: FloatArray
    octave_degrees: FloatArray
    drift: FloatArray
    drift_degrees: int

    def only(self, kept: Sequence[int]) -> "Residues":
        """Those of some of the roundings."""
        left, groups = np.unique(self.groups[kept], return_inverse=True)
        return Residues(
            self.frames, self.mean[kept], self.variance[kept], self.histogram[kept], groups,
            self.correlation[:, left][:, :, left], self.to_input[:, kept], self.octaves[:, kept], self.octave_degrees,
            self.drift[kept], self.drift_degrees,
        )


class ResidueSum:
    """Sums of residues over blocks, which adjoin in each channel.

    `lowest`: the least residue of each rounding, (s,). `segment`: frames, even, in which spectra are taken.
    """

    def __init__(self, lowest: FloatArray, segment: int) -> None:
        count = len(lowest)
        self._lowest, self._grouping = lowest, _Grouping(count)
        self._frames = self._pairs = 0
        self._sum, self._squares, self._histogram = np.zeros(count), np.zeros(count), np.zeros((count, BINS))
        self._input_from, self._input_sum, self._input_squares = 0.0, 0.0, 0.0
        self._products = np.zeros((LAGS + 1, self._grouping.count, self._grouping.count))
        self._with_input = np.zeros((LAGS + 1, count))
        self._means: list[FloatArray] = []
        self._lengths: list[int] = []
        self._octaves = OctaveSum(count, segment)

    def add(self, x: FloatArray, residues: FloatArray, channel: int = 0) -> None:
        """One channel of a block: the input (frames,) and the residues (frames, s)."""
        if not self._frames:
            self._input_from = float(x.mean())
        centred = residues - (self._lowest + 0.5)
        self._frames += len(x)
        self._means.append(centred.mean(axis=0))
        self._lengths.append(len(x))
        self._sum += self._means[-1] * len(x)
        self._squares += np.einsum("fs,fs->s", centred, centred)
        part = np.clip((residues - self._lowest) * BINS, 0, BINS - 1).astype(np.int64)
        for k in range(len(self._lowest)):
            self._histogram[k] += np.bincount(part[:, k], minlength=BINS)
        singles = centred.astype(np.float32)
        self._add_products(x - self._input_from, singles)
        self._octaves.add(singles, channel)

    def _add_products(self, x: FloatArray, values: Singles) -> None:
        self._input_sum += float(x.sum())
        self._input_squares += float(np.square(x).sum())
        later, pairs = slice(LAGS, None), len(x) - LAGS
        if pairs <= 0:
            return
        self._pairs += pairs
        delayed = np.column_stack([x[LAGS - lag : LAGS - lag + pairs] for lag in range(LAGS + 1)]).astype(np.float32)
        self._with_input += product_sum(delayed, values[later])
        grouped = self._grouping.sums(values)
        for lag in range(LAGS + 1):
            self._products[lag] += product_sum(grouped[LAGS - lag : LAGS - lag + pairs], grouped[later])

    def result(self) -> Residues:
        """Everything that was added; at least one block."""
        mean = self._sum / self._frames
        variance = np.maximum(self._squares / self._frames - mean**2, 0.0)
        input_mean = self._input_sum / self._frames
        input_variance = max(0.0, self._input_squares / self._frames - input_mean**2)
        group_mean, group_variance = self._grouping.of_sums(mean), self._grouping.of_squares(variance)
        between = self._products / self._pairs - np.outer(group_mean, group_mean)
        to_input = self._with_input / self._pairs - input_mean * mean
        deviation, group_deviation = np.sqrt(variance), np.sqrt(group_variance)
        return Residues(
            self._frames, mean + self._lowest + 0.5, variance, self._histogram / self._frames, self._grouping.groups,
            _over(between, np.outer(group_deviation, group_deviation)), _over(to_input, np.sqrt(input_variance) * deviation),
            *self._octaves.result(), *self._drift(mean, variance),
        )

    def _drift(self, mean: FloatArray, variance: FloatArray) -> tuple[FloatArray, int]:
        degrees = max(1, len(self._means) - 1)
        scatter = np.array(self._lengths) @ (np.array(self._means) - mean) ** 2 / degrees
        return _over(scatter, variance), degrees


class _Grouping:
    """Roundings in at most MOST_PAIRED groups, by chance but always the same."""

    def __init__(self, count: int) -> None:
        rng = np.random.default_rng(GROUPING_SEED)
        self.count = min(count, MOST_PAIRED)
        self._alone = count <= MOST_PAIRED
        self.groups = np.arange(count) if self._alone else rng.permutation(count) % MOST_PAIRED
        signs = np.ones(count) if self._alone else rng.choice([-1.0, 1.0], count)
        self._signed = np.where(self.groups[:, None] == np.arange(self.count), signs[:, None], 0.0)

    def sums(self, values: Singles) -> Singles:
        """Of the roundings of each group, (frames, g)."""
        if self._alone:
            return values
        order = np.argsort(self.groups, kind="stable")
        signed = values[:, order] * self._signed.sum(axis=1)[order].astype(np.float32)
        return np.add.reduceat(signed, np.searchsorted(self.groups[order], np.arange(self.count)), axis=1)

    def of_sums(self, values: FloatArray) -> FloatArray:
        return np.asarray(values @ self._signed)

    def of_squares(self, values: FloatArray) -> FloatArray:
        return np.asarray(values @ self._signed**2)


class OctaveSum:
    """Power of residues by octave: Hann windows of `length` frames, even, at half overlap, up to the last frame.

    Each channel's blocks adjoin.
    """

    def __init__(self, count: int, length: int) -> None:
        self._length, self._half = length, length // 2
        self._window = np.hanning(length + 1)[:-1].astype(np.float32)
        self._power, self._segments = np.zeros((OCTAVES, count)), 0
        self._pending: dict[int, Singles] = {}
        self._next: dict[int, int] = {}

    def add(self, values: Singles, channel: int) -> None:
        """(frames, s)."""
        pending, start = values, self._next.get(channel, 0)
        if channel in self._pending:
            pending = np.concatenate((self._pending[channel], values))
        while len(pending) - start >= self._length:
            self._power += self._octaves(pending[start : start + self._length])
            self._segments += 1
            start += self._half
        kept = min(start, max(0, len(pending) - self._length))  # the last segment ends with the last frame
        self._pending[channel], self._next[channel] = pending[kept:].copy(), start - kept

    def result(self) -> tuple[FloatArray, FloatArray]:
        """Densities over that of all, and their degrees of freedom."""
        power, segments = self._power.copy(), self._segments
        for channel, pending in self._pending.items():
            if self._length <= len(pending) > self._next[channel] + self._half:
                power += self._octaves(pending[-self._length :])
                segments += 1
        widths = np.diff(octave_edges(2))[:, None]
        whole = (power * widths).sum(axis=0) / widths.sum()
        degrees = 2.0 * np.diff(octave_edges(self._half + 1)) * HANN_SHARE * segments
        return _over(power, whole), degrees

    def _octaves(self, segment: Singles) -> FloatArray:
        from scipy.fft import rfft

        power = np.square(np.abs(rfft((segment - segment.mean(axis=0)).T * self._window, axis=1)), dtype=np.float64)
        power[:, 1:-1] *= 2.0
        return octave_powers(power) / np.diff(octave_edges(self._half + 1))[:, None]


HANN_SHARE = 18.0 / 35.0 / (1.0 + 6.0 / 70.0)
"""Of a segment's frames, how many a Hann window at half overlap leaves to tell power from: (sum w^2)^2 / (n sum w^4), over
what the powers of neighbours have in common, twice sum w^2 w'^2 / sum w^4."""


def octave_edges(bins: int) -> FloatArray:
    """Edges in bins of a spectrum from 0 to half the rate: 0, then octaves up to the last bin."""
    return np.concatenate(([0.0], (bins - 1) * 2.0 ** -np.arange(OCTAVES - 1.0, -1.0, -1.0)))


def octave_powers(power: FloatArray) -> FloatArray:
    """Power of spectra by bin, (s, bins), by octave, (OCTAVES, s); a bin is parted where an edge goes through it.

    Bin k reaches from k - 1/2 to k + 1/2, but the first and the last are halves.
    """
    edges = octave_edges(power.shape[1])
    bins = np.floor(edges + 0.5).astype(np.intp)
    parts = edges + 0.5 - bins
    parts[0], parts[-1] = 0.0, 1.0
    below = power[:, bins] * parts
    whole = np.add.reduceat(power, bins, axis=1)[:, :-1]
    return np.asarray((whole - below[:, :-1] + below[:, 1:]).T)


def product_sum(a: Singles, b: Singles) -> FloatArray:
    """a' b of (frames, m) and (frames, n), in single precision over short pieces, in double over all."""
    size = min(4096, max(1, SMALL_PRODUCT // (a.shape[1] * b.shape[1])))
    whole = len(a) // size * size
    pieces = np.matmul(a[:whole].reshape(-1, size, a.shape[1]).transpose(0, 2, 1), b[:whole].reshape(-1, size, b.shape[1]))
    return np.asarray(pieces.sum(axis=0, dtype=np.float64) + a[whole:].T @ b[whole:])


def _over(value: FloatArray, scale: FloatArray) -> FloatArray:
    """The quotient, 0 where there is nothing to divide by."""
    return np.divide(value, scale, out=np.zeros_like(value), where=np.broadcast_to(scale > 0.0, value.shape))
