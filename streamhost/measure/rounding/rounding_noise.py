"""Noise predicted from the diagram and measured on a signal."""

from dataclasses import asdict
from math import inf

import numpy as np
from numpy.typing import NDArray

from streamhost.formats import Float
from streamhost.measure.limits import limit_band, limit_signal
from streamhost.measure.measuring import Figures, Measured, measure
from streamhost.measure.rounding.result import OutputNoise, RoundingNoise
from streamhost.realization import Realization


def noise(realization: Realization, x: NDArray[np.float64] | None = None) -> RoundingNoise:
    """The noise of a realization on a signal (frames, channels), 1.0 = full scale; unless given, `limit_signal`."""
    signal = limit_signal(realization.rate, realization.diagram.channels) if x is None else x
    return figures_of(realization, measure(realization, signal, limit_band({}, realization.rate)))


def figures_of(realization: Realization, found: Measured) -> RoundingNoise:
    """What was found of the noise in a run."""
    several = len(found.outputs) > 1
    each = tuple(_of_output(figures, figures.name if several else "") for figures in found.outputs)
    worst = max(each, key=lambda one: inf if one.measured_dbfs is None else one.measured_dbfs)
    estimate = isinstance(realization.format, Float)
    return RoundingNoise(**asdict(worst), ideal=found.ideal, estimate=estimate, outputs=each if several else ())


def _of_output(figures: Figures, name: str) -> OutputNoise:
    measured, predicted = figures.noise, figures.prediction
    return OutputNoise(
        output=name,
        predicted_dbfs=predicted.dbfs if predicted is not None else None,
        predicted_full_dbfs=predicted.full_dbfs if predicted is not None else None,
        predicted_a_dbfs=predicted.a_dbfs if predicted is not None else None,
        measured_dbfs=measured.dbfs,
        measured_interval_db=measured.interval_db,
        measured_full_dbfs=measured.full_dbfs,
        measured_a_dbfs=measured.a_dbfs,
        mean_lsb=figures.dc_lsb,
        white_model_holds=figures.white.holds,
        white_model_reason=figures.white.reason,
        excluded_percent=100.0 * measured.excluded,
        channel=figures.channel,
        reason=measured.reason,
    )
