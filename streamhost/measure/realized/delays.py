"""Delay and phase of one output, as asked and as stored."""

from math import inf, pi

import numpy as np

from streamhost.diagram.norms import responses_from_input, settling_frames
from streamhost.measure.bands import Band
from streamhost.measure.deviation import JUDGED, ComplexArray, Responses
from streamhost.measure.frequencies import FloatArray, breakpoints, refined
from streamhost.measure.realized.result import OutputResponse, Root

PARTS = 8
STEP = 1e-3
"""Of the distance to the nearest pole, over which a phase is differenced: its third derivative then counts 1e-6."""
LONGEST = 1 << 22


def output_response(
    responses: Responses, name: str, band: Band, zeros: tuple[Root, ...], zeros_reason: str
) -> OutputResponse:
    """Curves over 0 to half the rate, the figures of delay over the band, and the zeros, which are passed on."""
    rate, poles = responses.realization.rate, list(responses.poles)
    edges = (2.0 * pi * edge / rate for edge in band)
    w = np.unique(np.concatenate([refined(breakpoints(poles, 0.0, pi), PARTS), list(edges)]))
    asked, stored = _at(responses, w)
    asked_delay, stored_delay = _delays(responses, w, poles)
    hertz = w * rate / (2.0 * pi)
    magnitude = np.where((hertz >= band[0]) & (hertz <= band[1]) & np.isfinite(asked), np.abs(asked), 0.0)
    judged = (magnitude >= magnitude.max() * JUDGED) & (magnitude > 0.0)
    frames, onset = _latency(responses)
    return OutputResponse(
        output=name,
        latency_frames=frames,
        latency_ms=None if frames is None else 1000.0 * frames / rate,
        onset_frames=onset,
        group_delay_least_frames=_least(stored_delay[judged]),
        group_delay_most_frames=_most(stored_delay[judged]),
        group_delay_deviation_frames=_most(np.abs(stored_delay - asked_delay)[judged]),
        phase_deviation_degrees=_most(np.abs(np.degrees(_angle(stored, asked)))[judged]),
        zeros=zeros, zeros_reason=zeros_reason,
        hertz=hertz, asked=asked, stored=stored, asked_delay_frames=asked_delay, stored_delay_frames=stored_delay,
    )


def _at(responses: Responses, w: FloatArray) -> tuple[ComplexArray, ComplexArray]:
    """H at any angles: those of the lower half circle are the conjugates of the upper."""
    turned = np.abs(np.remainder(w + pi, 2.0 * pi) - pi)
    lower = np.remainder(w + pi, 2.0 * pi) < pi
    rate = responses.realization.rate
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        asked, stored = responses.at(np.minimum(turned * rate / (2.0 * pi), rate / 2.0))
        return np.where(lower, asked.conj(), asked), np.where(lower, stored.conj(), stored)


def _delays(responses: Responses, w: FloatArray, poles: list[complex]) -> tuple[FloatArray, FloatArray]:
    """Group delays in frames, asked and stored; NaN where H is 0 or no number."""
    states = responses.realization.program.state_words
    nearest = np.abs(np.exp(1j * w)[:, None] - np.array(poles)).min(axis=1) if poles else np.ones(len(w))
    step = STEP * np.clip(nearest, 1e-9, 1.0 / (1 + states))
    above, below = _at(responses, w + step), _at(responses, w - step)
    asked, stored = (-_angle(up, down) / (2.0 * step) for up, down in zip(above, below, strict=True))
    return asked, stored


def _angle(values: ComplexArray, others: ComplexArray) -> FloatArray:
    """From others to values, in radians; NaN where there is none."""
    known = np.isfinite(values) & np.isfinite(others) & (values != 0.0) & (others != 0.0)
    between = np.where(known, values, 1.0) * np.where(known, others, 1.0).conj()
    return np.where(known, np.angle(between), np.nan)


def _latency(responses: Responses) -> tuple[float | None, int | None]:
    """The centre of the energy of the impulse response, sum n h^2 / sum h^2, and the first frame that is not 0.

    By Parseval that is the group delay averaged over |H|^2. Of a response that is longer than 2^22 frames or does not die
    out there is no centre.
    """
    diagram = responses.realization.program.diagram
    channel, nodes = min(responses.channel, diagram.channels - 1), [diagram.outputs[k] for k in responses.outputs]
    settling = settling_frames(diagram, channel, nodes=nodes)
    known = settling if settling <= LONGEST else inf
    frames = int(known) if known < inf else 2 * responses.realization.program.state_words + 2
    h = responses_from_input(diagram, channel, nodes=nodes, frames=frames + 1).sum(axis=1)
    heard = np.flatnonzero(h)
    onset = int(heard[0]) if len(heard) else None
    if known == inf or onset is None:
        return None, onset
    energy = h**2
    return float(np.arange(len(h)) @ energy / energy.sum()), onset


def _most(values: FloatArray) -> float | None:
    known = values[np.isfinite(values)]
    return float(known.max()) if len(known) else None


def _least(values: FloatArray) -> float | None:
    known = values[np.isfinite(values)]
    return float(known.min()) if len(known) else None
