"""The masks of standards as limits on the realized response."""

from itertools import pairwise
from math import inf, pi

import numpy as np
from numpy.typing import NDArray

from streamhost.errors import RequestError, nearest
from streamhost.filters.curves.bands import exact_hz
from streamhost.filters.curves.masks import MASKS, Mask, mid_bands_text
from streamhost.measure.deviation import Responses
from streamhost.measure.frequencies import breakpoints, refined
from streamhost.measure.realized.result import MaskMargin

FloatArray = NDArray[np.float64]
PARTS = 16
POINTS_A_CORNER = 32
DIGITS = 6
CANDIDATES = 3


def mask_margin(responses: Responses, name: str, output: str, nominal_hz: float | None = None) -> MaskMargin:
    """How far the stored response to an output is inside a mask of MASKS. RequestError for a name or mid-band it lacks."""
    if name not in MASKS:
        raise RequestError(f'There is no mask "{name}": {", ".join(MASKS)}.{nearest(name, MASKS)}')
    mask, rate = MASKS[name], responses.realization.rate
    if nominal_hz is not None and nominal_hz not in mask.nominals:
        raise RequestError(f"mask_hz = {nominal_hz:g} is not allowed: {mid_bands_text(name)}.")
    mids = [nominal_hz] if nominal_hz is not None else _likely(responses, mask)
    found = [_margin(responses, mask, each) for each in mids or [0.0]]
    if not any(np.isfinite(margin) for margin, _ in found):
        reason = "with its coefficients rounded the filter is not stable and has no response"
        return MaskMargin(name, output, nominal_hz, None, None, rate / 2.0, mask.source, reason)
    margin, hertz = max(found)
    mid = mids[found.index((margin, hertz))] if mids else None
    return MaskMargin(name, output, mid, margin, float(f"{hertz:.{DIGITS}g}"), rate / 2.0, mask.source, "")


def _likely(responses: Responses, mask: Mask) -> list[float]:
    """The mid-bands at which most passes: a mask asks for the least attenuation there."""
    mids = [each for each in mask.nominals if exact_hz(each) < responses.realization.rate / 2.0]
    gains = _decibels(responses, np.array([exact_hz(each) for each in mids])) if mids else np.zeros(0)
    return [mids[k] for k in sorted(np.argsort(-gains)[:CANDIDATES].tolist())]


def _margin(responses: Responses, mask: Mask, nominal: float) -> tuple[float, float]:
    """The least margin, and where; minus infinity without a response."""
    rate = responses.realization.rate
    hertz = _points(responses, mask, nominal)
    gains = _decibels(responses, hertz)
    if nominal:
        gains = gains - _decibels(responses, np.array([exact_hz(nominal)]))
    if np.isnan(gains).any() or (gains == inf).any() or not np.isfinite(gains).any():
        return -inf, rate / 2.0
    lower, upper = mask.limits(hertz, nominal)
    with np.errstate(invalid="ignore"):
        margins = np.minimum(np.where(lower == -inf, inf, gains - lower), np.where(gains == -inf, inf, upper - gains))
    place = int(margins.argmin())
    return float(margins[place]), float(hertz[place])


def _points(responses: Responses, mask: Mask, nominal: float) -> FloatArray:
    """Above 0 Hz and below half the rate: the mask's corners, points between them, and more around each pole."""
    rate = responses.realization.rate
    corners = [each for each in mask.corners(nominal) if each < rate / 2.0]
    between = [np.geomspace(low, high, POINTS_A_CORNER) for low, high in pairwise(corners)]
    around = refined(breakpoints(responses.poles, 0.0, pi), PARTS) * rate / (2.0 * pi)
    together = np.unique(np.concatenate([corners, *between, around]))
    return together[(together > 0.0) & (together < rate / 2.0)]


def _decibels(responses: Responses, hertz: FloatArray) -> FloatArray:
    stored = responses.at(hertz)[1]
    with np.errstate(divide="ignore"):
        return np.asarray(20.0 * np.log10(np.abs(stored)), dtype=np.float64)
