"""One tone at one level: what comes out beside it."""

from dataclasses import dataclass, replace
from math import inf

import numpy as np
from numpy.typing import NDArray

from streamhost.formats import Fixed
from streamhost.measure.levels import decibels, power_dbfs
from streamhost.measure.tones.lines import Spectra, distortion, lines
from streamhost.measure.tones.periodogram import Periodogram, audio_shares
from streamhost.measure.tones.result import Setting, WorstSpectrum
from streamhost.measure.tones.steady import SteadyRun
from streamhost.measure.weighting import a_weighting
from streamhost.realization import Realization
from streamhost.signals import level, turning

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class Rest:
    """The power of a spectrum in the audio band: of all, without the fundamental, and A-weighted without it."""

    all: float
    residual: float
    residual_a: float

    @property
    def ratio_db(self) -> float | None:
        """Everything but the fundamental over everything."""
        return decibels(self.residual / self.all) if self.all else None


def rest_of(spectrum: Periodogram, bin: int | None) -> Rest:
    """What a spectrum holds beside a fundamental; 0 Hz is never counted."""
    shares = audio_shares(spectrum)
    residual = spectrum.without(bin).power * shares
    total = float(spectrum.without(None).power @ shares)
    return Rest(total, float(residual.sum()), float(residual @ a_weighting(spectrum.frequencies)))


def full_scale(realization: Realization) -> float:
    """The largest a tone can be: 1.0, or the input's largest code where that is below."""
    if not isinstance(realization.format, Fixed):
        return 1.0
    word = realization.format.input.word
    return float(min(1.0, word.high / 2.0**word.fraction))


def setting_of(spectra: Spectra, name: str, level_dbfs: float, overflow_frames: int) -> Setting:
    """The figures of one output."""
    assert spectra.bin is not None, "a setting has a tone"
    hz = spectra.bin * spectra.output.spacing
    rest, of_input = rest_of(spectra.output, spectra.bin), rest_of(spectra.of_input, spectra.bin)
    added = rest_of(spectra.added, spectra.bin)
    bare = Setting(name, level_dbfs, hz, added_dbfs=power_dbfs(added.residual), of_input_thd_n_db=of_input.ratio_db,
                   of_input_residual_dbfs=power_dbfs(of_input.residual), overflow_frames=overflow_frames)
    fundamental = spectra.output.line(spectra.bin)
    if not rest.all:
        return replace(bare, reason="nothing comes out")
    alone, most = distortion(spectra.output, spectra.floor, spectra.bin)
    clean = spectra.of_input.line(spectra.bin)
    return replace(
        bare,
        fundamental_dbfs=power_dbfs(fundamental),
        thd_n_db=rest.ratio_db,
        thd_n_a_db=decibels(rest.residual_a / rest.all),
        residual_dbfs=power_dbfs(rest.residual),
        residual_a_dbfs=power_dbfs(rest.residual_a),
        thd_db=decibels(alone / fundamental) if alone and fundamental else None,
        thd_at_most_db=decibels(most / fundamental) if most and fundamental else None,
        of_input_thd_db=_thd_of_input(spectra, clean),
        lines=lines(spectra),
    )


def _thd_of_input(spectra: Spectra, fundamental: float) -> float | None:
    """Judged by the noise in the output, as the output's own."""
    assert spectra.bin is not None, "a setting has a tone"
    alone = distortion(spectra.of_input, spectra.floor, spectra.bin)[0]
    return decibels(alone / fundamental) if alone > 0.0 and fundamental else None


def measured_setting(
    run: SteadyRun, output: int, bin: int, level_dbfs: float
) -> tuple[Setting, WorstSpectrum | None]:
    """A tone of so many periods in the window through a realization; of several channels the one that adds most.

    The setting, and its spectrum where there is one.
    """
    realization = run.realization
    name = realization.outputs[output] if len(realization.outputs) > 1 else ""
    peak = level(level_dbfs) * full_scale(realization)
    steady = run.window_of(peak * turning(run.frames, bin, run.window))
    if steady.ran_away:
        hz = bin * realization.rate / run.window
        return Setting(name, level_dbfs, hz, reason="the output or the ideal runs away"), None
    found = []
    for channel in range(run.channels):
        spectra = run.spectra(steady, output, channel, bin)
        setting = setting_of(spectra, name, level_dbfs, int(steady.overflows[channel]))
        found.append((replace(setting, channel=channel + 1 if run.channels > 1 else None), spectra))
    place = max(range(len(found)), key=lambda k: found[k][0].added_dbfs or -inf)
    setting, spectra = found[place]
    spectrum = WorstSpectrum(
        spectra.output.frequencies, spectra.output.power, spectra.of_input.power, spectra.floor,
        steady.output[:, output, place : place + 1], steady.difference[:, output, place : place + 1],
    )
    return setting, spectrum
