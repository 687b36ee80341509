"""Lines in a spectrum: which stand out of the noise, where exactly, and how they are related to the fundamental."""

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from streamhost.measure.levels import decibels, power_dbfs
from streamhost.measure.tones.periodogram import Periodogram, alarm, audio_shares, over_median_db
from streamhost.measure.tones.result import Line

FloatArray = NDArray[np.float64]

MOST_ORDER = 50
MOST_LINES = 8
WIDE = 2
"""Bins to either side that hold a line which is not coherent."""

OWN_SHARE = 0.25


@dataclass(frozen=True, eq=False)
class Spectra:
    """Of the output, of the ideal on the same quantized input, and of their difference; `floor`: noise in the first, by bin.

    bin: of the fundamental, None without one.
    """

    output: Periodogram
    of_input: Periodogram
    added: Periodogram
    floor: FloatArray
    bin: int | None


def harmonics(bin: int, frames: int) -> Iterator[tuple[int, int, bool]]:
    """(order, bin, whether it is an alias) of the harmonics 2 to 50 of a bin in a window, folded at half the rate."""
    for order in range(2, MOST_ORDER + 1):
        around = order * bin % frames
        yield order, min(around, frames - around), 2 * order * bin > frames


def distortion(spectrum: Periodogram, floor: FloatArray, bin: int) -> tuple[float, float]:
    """The power of the harmonics in the audio band that stand out of the noise, without it; and of all, with it."""
    shares = audio_shares(spectrum)
    within = [at for _, at, alias in harmonics(bin, spectrum.frames) if not alias and shares[at] > 0.0]
    limit = alarm(max(1, len(within)))
    clear = [at for at in within if spectrum.power[at] > limit * floor[at]]
    alone = sum(spectrum.line(at) - float(floor[at - 1 : at + 2].sum()) for at in clear)
    return alone, sum(spectrum.line(at) for at in within)


def lines(spectra: Spectra) -> tuple[Line, ...]:
    """The strongest lines in the audio band, at most eight."""
    power = spectra.output.without(spectra.bin).power
    shares = audio_shares(spectra.output)
    limit = alarm(int(np.count_nonzero(shares)))
    wide = np.lib.stride_tricks.sliding_window_view(np.pad(power, WIDE), 2 * WIDE + 1)
    peaks = np.flatnonzero((power > limit * spectra.floor) & (power == wide.max(axis=1)) & (shares > 0.0))
    strongest = peaks[np.argsort(-power[peaks], kind="stable")][:MOST_LINES]
    return tuple(line_at(spectra, int(bin)) for bin in strongest)


def line_at(spectra: Spectra, bin: int) -> Line:
    """What there is to say of the line whose strongest bin this is."""
    relation, order = _relation(spectra.bin, bin, spectra.output.frames)
    half = 1 if order is not None else WIDE
    cleared = spectra.output.without(spectra.bin)
    floor = spectra.floor[bin - half : bin + half + 1].sum()
    alone = max(cleared.line(bin, half) - float(floor), 0.0)
    fundamental = spectra.output.line(spectra.bin) if spectra.bin is not None else 0.0
    of_input, added = (each.without(spectra.bin).line(bin, half) for each in (spectra.of_input, spectra.added))
    return Line(
        hz=_frequency(cleared, bin, exact=order is not None),
        dbfs=power_dbfs(alone),
        over_fundamental_db=decibels(alone / fundamental) if fundamental else None,
        over_floor_db=over_median_db(float(cleared.power[bin] / spectra.floor[bin])),
        relation=relation,
        order=order,
        of_input_dbfs=power_dbfs(of_input),
        added_dbfs=power_dbfs(added),
        source="realization" if added > OWN_SHARE * alone else "input",
    )


def _relation(fundamental: int | None, bin: int, frames: int) -> tuple[str, int | None]:
    if fundamental is not None:
        for order, at, alias in harmonics(fundamental, frames):
            if abs(at - bin) <= 1:
                return ("alias" if alias else "harmonic"), order
    return "neither", None


def _frequency(spectrum: Periodogram, bin: int, *, exact: bool) -> float:
    """In Hz. Between bins by the ratio r of the two strongest under a Hann window, (2 r - 1) / (r + 1)."""
    if exact or bin + 1 >= len(spectrum.power):
        return bin * spectrum.spacing
    below, at, above = np.sqrt(spectrum.power[bin - 1 : bin + 2])
    side = 1.0 if above >= below else -1.0
    ratio = max(above, below) / at
    return float((bin + side * max(0.0, (2.0 * ratio - 1.0) / (ratio + 1.0))) * spectrum.spacing)
