"""How large each register's value can become: norms from the input, and a bound that holds for the rounded value."""

from collections.abc import Sequence
from dataclasses import dataclass
from math import inf, isfinite, sqrt

import numpy as np
from numpy.typing import NDArray

from streamhost.diagram.fan import from_input
from streamhost.diagram.graph import reachable
from streamhost.diagram.norms import Norms, norms_from_input, responses_from_input, sums_from_errors
from streamhost.formats import Fixed
from streamhost.measure.overflows.places import Place
from streamhost.program.program import Program, RoundArithmetic
from streamhost.program.sources import Source, noise_sources

FloatArray = NDArray[np.float64]

WORST_SHARE = 1e-6
LONGEST_WORST = 1 << 18
"""A worst case leaves out what adds less than 1e-6 of the bound, or what lies more than so many frames back."""

SLACK = 1e-9
"""Of a bound in float64; l1 itself is never too small by more than rounding."""


@dataclass(frozen=True, eq=False)
class Bounds:
    """Of one channel, in order of the places: l1, l2, peak; highest and lowest value with all roundings before it."""

    l1: FloatArray
    l2: FloatArray
    peak: FloatArray
    highest: FloatArray
    lowest: FloatArray


def bounds(program: Program, places: Sequence[Place], channel: int) -> Bounds:
    """With every sample of the input from -1 to 1, or to the largest code of its word where that is less."""
    nodes = sorted({node for place in places for node, _ in (*place.parts, (place.node, 1.0))})
    norms = norms_from_input(program.diagram, channel, nodes=nodes)
    errors = error_bounds(program, nodes, channel)
    constant = _constant_gains(program, nodes, channel)
    column = {node: k for k, node in enumerate(nodes)}
    found = np.array([_of_place(program, place, norms, errors, constant, column) for place in places]).reshape(-1, 5)
    return Bounds(*found.T)


def _of_place(
    program: Program, place: Place, norms: Norms, errors: FloatArray, constant: FloatArray, column: dict[int, int]
) -> tuple[float, float, float, float, float]:
    """A value is positive parts of h times at most the highest input, and negative parts times the lowest."""
    assert isinstance(program.format, Fixed), "floats have no words"
    word = program.format.input.word
    most, least = min(1.0, word.high * 2.0**-word.fraction), min(1.0, -word.low * 2.0**-word.fraction)
    l1 = highest = lowest = 0.0
    own, scale = (column[place.node], 1.0) if place.kind != "operand" else (column[place.parts[0][0]], place.parts[0][1])
    for node, factor in place.parts:
        k = column[node]
        sum_of_all, signed = float(norms.l1[k]), float(constant[k])
        if not isfinite(sum_of_all):
            return inf, inf, inf, inf, inf
        positive, negative = (sum_of_all + signed) / 2.0, (sum_of_all - signed) / 2.0
        l1 += factor * sum_of_all
        up, down = positive * most + negative * least, positive * least + negative * most
        if place.parts != ((place.node, 1.0),):  # what is added up may come with either sign
            up = down = max(up, down)
        highest += factor * (up + float(errors[k]))
        lowest += factor * (down + float(errors[k]))
    own_errors = _own_errors(place, float(errors[own]))
    return l1, scale * float(norms.l2[own]), scale * float(norms.peak[own]), highest + own_errors, lowest + own_errors


def _own_errors(place: Place, at_node: float) -> float:
    """What is rounded at the place itself, and so is not among the errors of its parts: 3/2 of a step at most in a tap."""
    if place.kind == "operand":
        return 1.5 * place.step
    return at_node if place.parts != ((place.node, 1.0),) else 0.0


def _constant_gains(program: Program, nodes: Sequence[int], channel: int) -> FloatArray:
    """sum h of each node: the gain for a constant; 0 where there is none, and l1 is then infinite."""
    fan = from_input(program.diagram, channel, nodes=nodes)
    try:
        states = np.linalg.solve(np.eye(len(fan.entry)) - fan.A, fan.entry)
    except np.linalg.LinAlgError:
        return np.zeros(len(nodes))
    return np.asarray(fan.direct + fan.exits @ states)


def error_bounds(program: Program, nodes: Sequence[int], channel: int) -> FloatArray:
    """How far all roundings together can push each node, (nodes,)."""
    largest: dict[int, float] = {}
    for source in noise_sources(program, channel):
        for node, _ in source.places:
            largest[node] = largest.get(node, 0.0) + _largest_error(program, source)
    if not largest:
        return np.zeros(len(nodes))
    sums = sums_from_errors(program.diagram, list(largest), nodes, channel)
    return np.asarray(np.array(list(largest.values())) @ sums, dtype=np.float64)


def _largest_error(program: Program, source: Source) -> float:
    """Not too small. A register's rounding is off by half a step, cut off by one, and dither moves it by one more.

    Of an error inside a sum, |mean| + root(3 variance) is 1/2 of a step or more for rounding, and 1 or more for cutting off.
    """
    arithmetic = program.arithmetic[source.places[0][0]]
    if not isinstance(arithmetic, RoundArithmetic):
        return abs(source.mean) + sqrt(3.0 * source.variance)
    quantizer = arithmetic.quantizer
    steps = (0.5 if quantizer.rounding.startswith("half") else 1.0) + (1.0 if quantizer.dither else 0.0)
    return float(steps * 2.0**-quantizer.word.fraction)


def fitting(places: Sequence[Place], found: Bounds) -> list[bool]:
    """Whether each value keeps within its word: its code is a whole number, so that less than 1 beyond is not beyond."""
    return [
        bool(found.highest[k] * (1.0 + SLACK) / place.step < place.word.high + 1
             and found.lowest[k] * (1.0 + SLACK) / place.step < -place.word.low + 1)
        for k, place in enumerate(places)
    ]


def proven(program: Program, places: Sequence[Place], fits: Sequence[bool]) -> list[bool]:
    """Whether it and all that it depends on fit: as long as none of these has overflowed, the bounds hold."""
    reads = [list(node.reads) for node in program.nodes]
    unfit = {place.node for place, fit in zip(places, fits, strict=True) if not fit}
    return [fit and not unfit.intersection(reachable(reads, [place.node])) for place, fit in zip(places, fits, strict=True)]


def worst_input(program: Program, place: Place, channel: int) -> tuple[FloatArray | None, float | None]:
    """sign(h[-n]) (frames,), and what it makes of the value in its last frame; None where the response does not die out.

    Full scale negative is the largest sample, and meets the larger part of h; positive samples end at the input's word.
    """
    assert isinstance(program.format, Fixed), "floats have no words"
    word = program.format.input.word
    node, factor = (place.node, 1.0) if place.kind != "operand" else place.parts[0]
    h = _whole_response(program, node, channel)
    if h is None:
        return None, None
    signs = np.where(h >= 0.0, 1.0, -1.0)[::-1] * (-1.0 if h.sum() > 0.0 else 1.0)
    x = np.clip(signs, max(-1.0, word.low * 2.0**-word.fraction), min(1.0, word.high * 2.0**-word.fraction))
    return x, abs(float(x[::-1] @ h)) * factor


def _whole_response(program: Program, node: int, channel: int) -> FloatArray | None:
    """As much of it as makes up its l1, but for a part of 1e-6, within the longest worst case."""
    if not isfinite(float(norms_from_input(program.diagram, channel, nodes=[node]).l1[0])):
        return None
    frames, ended = 2 * program.state_words + (1 << 10), False
    while not ended:
        h = responses_from_input(program.diagram, channel, nodes=[node], frames=frames)[:, 0]
        reached = np.cumsum(np.abs(h))
        ended = reached[-1] - reached[frames // 2] <= WORST_SHARE * reached[-1] or frames >= LONGEST_WORST
        frames *= 2
    return np.asarray(h[: int(np.searchsorted(reached, reached[-1] * (1.0 - WORST_SHARE))) + 1])
