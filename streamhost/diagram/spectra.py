"""Frequency responses of a fan, and where they are largest."""

from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from streamhost.diagram.fan import ComplexArray, Fan, FloatArray

CANDIDATES = 3
ZOOMS = 7
ZOOM_POINTS = 9
MARGINAL = 1e-9
NUDGE = 1e-7
CHUNK = 1 << 22


class Spectrum(Protocol):
    """Frequency responses at several exits; w in radians a frame."""

    def survey(self) -> tuple[FloatArray, FloatArray]:
        """Frequencies (points,) from 0 to pi, so dense that no peak lies hidden, and the magnitudes (points, exits)."""
        ...

    def at(self, w: FloatArray) -> ComplexArray:
        """At the same frequencies for all exits: (points,) -> (points, exits)."""
        ...

    def each(self, w: FloatArray) -> ComplexArray:
        """At frequencies of its own for each exit: (exits, points) -> (exits, points)."""
        ...


@dataclass(frozen=True, eq=False)
class FiniteSpectrum:
    """Of responses that are over: h (frames, exits)."""

    h: FloatArray

    def survey(self) -> tuple[FloatArray, FloatArray]:
        """Eight points or more a frame; exits scaled alike, for a transform of many mixes their rounding errors."""
        points = 1 << (8 * len(self.h)).bit_length()
        largest = np.abs(self.h).max(axis=0)
        scale = np.where(largest > 0.0, largest, 1.0)
        magnitudes = np.abs(np.fft.rfft(self.h / scale, n=points, axis=0)) * scale
        return np.linspace(0.0, np.pi, len(magnitudes)), magnitudes

    def at(self, w: FloatArray) -> ComplexArray:
        """As rows of about sqrt(frames) frames: sum over rows of exp(-j w row) times the sum within the row."""
        frames, exits = self.h.shape
        width = 1 + int(np.sqrt(frames))
        rows = np.zeros((width, width, exits))
        rows.reshape(-1, exits)[:frames] = self.h
        n = np.arange(width)
        parts = np.array_split(w, 1 + w.size * width * exits // CHUNK)
        return np.concatenate([np.einsum("qr,qre->qe", np.exp(-1j * np.outer(part, n * width)),
                                         np.tensordot(np.exp(-1j * np.outer(part, n)), rows, axes=(1, 1)))
                               for part in parts])

    def each(self, w: FloatArray) -> ComplexArray:
        return np.array([FiniteSpectrum(self.h[:, i:i + 1]).at(row)[:, 0] for i, row in enumerate(w)])


@dataclass(frozen=True, eq=False)
class ResonantSpectrum:
    """Of responses that go on for ever: direct + exits (z - A)^-1 entry."""

    fan: Fan

    def survey(self) -> tuple[FloatArray, FloatArray]:
        """Around the angle of each pole in steps that grow from a quarter of its distance from the circle."""
        points = [np.linspace(0.0, np.pi, 257)]
        for pole in self.fan.poles:
            distance = max(abs(1.0 - abs(pole)), MARGINAL)
            offsets = distance * 2.0 ** np.arange(-2.0, 3.0 - np.log2(distance))
            points.append(abs(np.angle(pole)) + np.concatenate((-offsets, [0.0], offsets)))
        w = self._thinned(np.unique(np.clip(np.concatenate(points), 0.0, np.pi)))
        return w, np.abs(self.at(w))

    def _thinned(self, w: FloatArray) -> FloatArray:
        """Without points so near to another that only rounding tells their magnitudes apart; both ends stay."""
        apart = np.abs(np.exp(1j * w)[:, None] - self.fan.poles).min(axis=1) / 20.0
        kept = [0]
        for i in range(1, len(w)):
            if w[i] - w[kept[-1]] >= max(apart[i], MARGINAL / 20.0):
                kept.append(i)
        if len(kept) > 1:
            kept[-1] = len(w) - 1
        return w[kept]

    def at(self, w: FloatArray) -> ComplexArray:
        return self._states(w) @ self.fan.exits.T + self.fan.direct

    def each(self, w: FloatArray) -> ComplexArray:
        states = self._states(w.ravel()).reshape(*w.shape, len(self.fan.entry))
        result: ComplexArray = np.einsum("pqs,ps->pq", states, self.fan.exits) + self.fan.direct[:, None]
        return result

    def _states(self, w: FloatArray) -> ComplexArray:
        """(z - A)^-1 entry as ((z - 1) - (A - 1))^-1 entry: near z = 1 nothing cancels."""
        w = self._beside_poles(w)
        size = len(self.fan.entry)
        entry, identity = self.fan.entry[:, None].astype(np.complex128), np.eye(size)
        parts = np.array_split(np.expm1(1j * w), 1 + w.size * size**2 // CHUNK)
        return np.concatenate([np.linalg.solve(part[:, None, None] * identity - (self.fan.A - identity), entry)[..., 0]
                               for part in parts])

    def _beside_poles(self, w: FloatArray) -> FloatArray:
        """Frequencies moved off the poles on the circle: not seen, but without a solution there."""
        for pole in self.fan.poles:
            if abs(abs(pole) - 1.0) < MARGINAL:
                angle = abs(np.angle(pole))
                beside = angle + NUDGE if angle < 1.0 else angle - NUDGE
                w = np.where(abs(w - angle) < NUDGE, beside, w)
        return w


def peaks(spectrum: Spectrum) -> FloatArray:
    """The largest magnitude at each exit: the highest points of the survey, each zoomed into."""
    w, magnitudes = spectrum.survey()
    edge = np.full((1, magnitudes.shape[1]), -1.0)
    padded = np.concatenate((edge, magnitudes, edge))
    local = (magnitudes >= padded[:-2]) & (magnitudes >= padded[2:])
    highest = np.argsort(np.where(local, magnitudes, -1.0), axis=0)[-CANDIDATES:].T
    low, high = w[np.maximum(highest - 1, 0)], w[np.minimum(highest + 1, len(w) - 1)]
    best: FloatArray = magnitudes.max(axis=0)
    for _ in range(ZOOMS):
        points = low[..., None] + (high - low)[..., None] * np.linspace(0.0, 1.0, ZOOM_POINTS)
        values = np.abs(spectrum.each(points.reshape(len(points), -1))).reshape(points.shape)
        best = np.maximum(best, values.max(axis=(1, 2)))
        top = values.argmax(axis=2)
        low, high = _pick(points, np.maximum(top - 1, 0)), _pick(points, np.minimum(top + 1, ZOOM_POINTS - 1))
    return best


def _pick(points: FloatArray, index: NDArray[np.intp]) -> FloatArray:
    exits, candidates = np.indices(index.shape)
    picked: FloatArray = points[exits, candidates, index]
    return picked
