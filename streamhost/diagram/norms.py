"""How large a signal becomes between an input and the nodes, and between the nodes and an output.

With x bounded by 1 a node is bounded by the L1 norm of its response; a sine of amplitude 1 makes it at most the peak of
its frequency response; white noise of power 1 gives it the power L2^2 (L. Jackson, Bell System Technical Journal 49,
1970; Oppenheim & Schafer, ch. 6). Everything is of one channel; a response that does not die out has infinite norms.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from math import inf

import numpy as np
from numpy.typing import ArrayLike, NDArray

from streamhost.diagram import fan as fans
from streamhost.diagram.course import Course, follow, settling, slowed, tail_energy
from streamhost.diagram.diagram import Diagram
from streamhost.diagram.fan import BoolArray, Fan, FloatArray, responses, state_blocks
from streamhost.diagram.spectra import FiniteSpectrum, ResonantSpectrum, Spectrum, peaks

L1_ACCURACY = 1e-10
MOST_FRAMES = 1 << 22
MOST_WORK = 2e10
MOST_SOLVED = 64
LONGEST_TRANSFORM = 1 << 18
"""Above so many states spectra are taken from the impulse response, if it is no longer than that, not solved for."""

SETTLED = 1e-12
LEAST_SETTLING = 64


@dataclass(frozen=True, eq=False)
class Norms:
    """Norms of impulse responses h, each (responses,).

    l1: sum |h|, never too small; l1_slack: what it may be too large by, 1e-9 of it or less unless the response lasts
    longer than 2^22 frames; infinite where the tail could not be bounded, and l1 is then the sum over what was run.
    l2: root of sum h^2; peak: largest magnitude of the frequency response, within 1e-6 of itself. A node that all but
    cancels has the rounding errors of the larger values behind it, 1e-14 of those or less.
    """

    l1: FloatArray
    l1_slack: FloatArray
    l2: FloatArray
    peak: FloatArray


def responses_from_input(diagram: Diagram, channel: int = 0, *, input: int = 0, nodes: Sequence[int] | None = None,
                         frames: int) -> FloatArray:
    """Impulse responses from an input to nodes (all of them unless named), shape (frames, nodes)."""
    return responses(fans.from_input(diagram, channel, input=input, nodes=nodes), frames)


def responses_to_output(diagram: Diagram, sources: Sequence[int], channel: int = 0, *, output: int = 0,
                        frames: int) -> FloatArray:
    """Impulse responses from errors at the source nodes to an output, shape (frames, sources)."""
    return responses(fans.to_output(diagram, sources, channel, output=output), frames)


def norms_from_input(diagram: Diagram, channel: int = 0, *, input: int = 0,
                     nodes: Sequence[int] | None = None) -> Norms:
    """Norms of the responses from an input to nodes (all of them unless named)."""
    return norms_of(fans.from_input(diagram, channel, input=input, nodes=nodes))


def sums_from_input(diagram: Diagram, channel: int = 0, *, input: int = 0, nodes: Sequence[int] | None = None) -> FloatArray:
    """sum |h| from an input to nodes, (nodes,), never too small: the l1 of `norms_from_input` without the rest."""
    return _absolute_sums(follow(fans.from_input(diagram, channel, input=input, nodes=nodes)))[0]


def sums_from_errors(diagram: Diagram, sources: Sequence[int], nodes: Sequence[int], channel: int = 0) -> FloatArray:
    """sum |h| from the error of each source node to nodes, (sources, nodes), never too small."""
    fan_of_each = fans.from_errors(diagram, sources, nodes, channel)
    return np.array([_absolute_sums(follow(fan))[0] for fan in fan_of_each]).reshape(len(sources), len(nodes))


def absolute_sums(fan: Fan) -> FloatArray:
    """The L1 norm of each response of a fan, never too small; infinite where it does not die out or could not be bounded."""
    l1, slack = _absolute_sums(follow(fan))
    return np.where(np.isfinite(slack), l1, inf)


def powers_from_input(diagram: Diagram, channel: int = 0, *, input: int = 0,
                      nodes: Sequence[int] | None = None) -> FloatArray:
    """The power that white noise of power 1 at an input gives at nodes, (nodes,): L2^2, without the rest."""
    return follow(fans.from_input(diagram, channel, input=input, nodes=nodes)).energy


def response_to_output(diagram: Diagram, sources: Sequence[int], frequencies: ArrayLike, channel: int = 0, *,
                       output: int = 0) -> NDArray[np.complex128]:
    """G from errors at the source nodes to an output, (frequencies, sources), at radians a frame.

    Infinite at every frequency for a source whose error does not die out: it has no stationary response.
    """
    w = np.atleast_1d(np.asarray(frequencies, dtype=np.float64))
    course = follow(fans.to_output(diagram, sources, channel, output=output))
    response = np.full((len(w), len(sources)), inf, dtype=np.complex128)
    for exits, spectrum in _spectra(course):
        response[:, exits] = spectrum.at(w)
    return response


def power_response(diagram: Diagram, sources: Sequence[int], frequencies: ArrayLike, channel: int = 0, *,
                   output: int = 0) -> FloatArray:
    """|G|^2 from errors at the source nodes to an output, (frequencies, sources), at radians a frame."""
    return np.abs(response_to_output(diagram, sources, frequencies, channel, output=output)) ** 2


def settling_frames(diagram: Diagram, channel: int = 0, *, input: int = 0, nodes: Sequence[int] | None = None) -> float:
    """Frames until what is left of the energy of each response is 120 dB below its total, at least 64.

    Of the outputs unless nodes are named, the longest; infinite where one does not die out.
    """
    course = follow(fans.from_input(diagram, channel, input=input, nodes=diagram.outputs if nodes is None else nodes))
    return max([float(LEAST_SETTLING), *(settling(course, i, SETTLED) for i in range(len(course.energy)))])


def norms_of(fan: Fan) -> Norms:
    """Of each response of a fan."""
    course = follow(fan)
    l1, slack = _absolute_sums(course)
    peak = np.full(len(l1), inf)
    for exits, spectrum in _spectra(course):
        peak[exits] = peaks(spectrum)
    return Norms(l1, slack, np.sqrt(course.energy), peak)


def _absolute_sums(course: Course) -> tuple[FloatArray, FloatArray]:
    l1 = np.where(np.isfinite(course.energy), np.abs(course.head).sum(axis=0), inf)
    unknown = course.ended & course.head[len(course.head) // 2:].any(axis=0) & course.run_down
    slack = np.where(unknown, inf, 0.0)
    if course.lively.any():
        lively = course.lively
        total, bound, _ = _summed_until_small(course.rest.watched(lively), l1[lively])
        l1[lively] = total + np.where(np.isfinite(bound), bound, 0.0)
        slack[lively] = bound
    return l1, slack


def _summed_until_small(fan: Fan, total: FloatArray) -> tuple[FloatArray, FloatArray, int]:
    """`total` and sum |exits A^k entry| over as many frames as it takes, the bound of what is left, and the frames."""
    states, exits = len(fan.entry), len(fan.direct)
    most = min(MOST_FRAMES, max(MOST_FRAMES >> 6, int(MOST_WORK / (states * (states + exits)))))
    frames, check = 0, 1 << 10
    for block in state_blocks(fan.A, fan.entry, min(1 << 12, max(64, (1 << 22) // exits))):
        total = total + np.abs(fan.exits @ block).sum(axis=1)
        frames += block.shape[1]
        if frames >= check:
            bound = _tail_bound(fan, fan.A @ block[:, -1])
            if (bound <= L1_ACCURACY * total).all() or frames >= most:
                return total, bound, frames
            check = 2 * frames
    raise AssertionError("the states go on without end")


def _tail_bound(fan: Fan, state: FloatArray) -> FloatArray:
    """An upper bound of sum |exits A^k state|; infinite where a pole is too near to the circle.

    With any p, sum |h| <= root of (sum (h / p^k)^2 times sum p^2k) (Cauchy and Schwarz). p^2 = the largest pole radius
    makes it exact for one real pole and 11 % too large for one pair; at least 1/4 will do, as all is soon over then.
    """
    radius = np.abs(fan.poles).max(initial=0.25)
    if radius >= 1.0:
        return np.full(len(fan.direct), inf)
    weighted = slowed(Fan(fan.A, state, fan.exits, fan.direct), float(np.sqrt(radius)))
    bound: FloatArray = np.sqrt(tail_energy(weighted) / (1.0 - radius))
    return bound


def _without_silence(h: FloatArray) -> FloatArray:
    """Responses up to the last frame in which one is not 0, and at least one frame."""
    return h[:max(np.flatnonzero(h.any(axis=1)).max(initial=0) + 1, 1)]


def _spectra(course: Course) -> list[tuple[BoolArray, Spectrum]]:
    """The exits that have a spectrum, by how it is computed."""
    found: list[tuple[BoolArray, Spectrum]] = []
    if course.ended.any():
        found.append((course.ended, FiniteSpectrum(_without_silence(course.head[:, course.ended]))))
    if course.lively.any():
        found.append((course.lively, _endless_spectrum(course.fan.watched(course.lively))))
    return found


def _endless_spectrum(fan: Fan) -> Spectrum:
    if len(fan.entry) > MOST_SOLVED:
        frames = _summed_until_small(fan, np.zeros(len(fan.direct)))[2]
        if frames <= LONGEST_TRANSFORM:
            return FiniteSpectrum(responses(fan, frames))
    return ResonantSpectrum(fan)
