"""The states in which a limit cycle can lie: a box of integers, in coordinates that make it small.

A narrow filter's states follow each other closely, and a box along them is nearly empty. In u = T x, with T of whole numbers
and determinant 1 or -1, each state is one point as before, and differences of states stand where states stood: T is found by
reducing the covariance that the roundings' errors give the states, pair by pair (the method of Lagrange and Gauss).
"""

from dataclasses import dataclass
from functools import cached_property
from math import isfinite, prod

import numpy as np
from numpy.typing import NDArray

from streamhost.diagram.nodes import Delay
from streamhost.diagram.rows import propagate
from streamhost.program.error_bounds import bounds
from streamhost.program.program import Program
from streamhost.program.sources import noise_sources

FloatArray = NDArray[np.float64]
Integers = NDArray[np.int64]

DOUBLINGS = 40
LARGEST_FACTOR = 1 << 20
"""Of T and its inverse: with words of 40 bits nothing of the walk exceeds 64."""


@dataclass(frozen=True, eq=False)
class Box:
    """The states x, in codes, with |T x| at most `limits`; `bounds` are those before they were cut to whole numbers.

    `transform` is T, `inverse` its inverse, (states, states); `words`: lowest and highest code of each state.
    """

    transform: Integers
    inverse: Integers
    bounds: tuple[float, ...]
    limits: tuple[int, ...]
    words: tuple[tuple[int, int], ...]
    plain: bool = False

    @cached_property
    def states(self) -> int:
        """Points of the box; some of them may lie outside the words."""
        return prod(2 * limit + 1 for limit in self.limits)

    @property
    def holds_all(self) -> bool:
        """Whether every state that the words can hold lies in it."""
        whole = [max(-low, high) for low, high in self.words]
        reach = np.abs(self.transform).astype(object) @ np.array(whole, dtype=object)
        return all(limit >= most for limit, most in zip(self.limits, reach, strict=True))


def box_of(program: Program, channel: int = 0, *, plain: bool = False) -> Box | None:
    """The box of a part's limit cycles without input or overflow; None where an error does not die out.

    `plain`: larger, of bounds that are easy to check.
    """
    delays = [index for index, node in enumerate(program.nodes) if isinstance(node, Delay)]
    steps = np.array([2.0 ** program.numbers[index].fraction for index in delays])
    words = tuple((-program.numbers[index].bound, program.numbers[index].bound - 1) for index in delays)
    identity = np.eye(len(delays), dtype=np.int64)
    transforms = [each for each in (identity, _reduced(program, channel, steps)) if each is not None]
    found = [_box(program, channel, each, steps, words, plain=plain) for each in transforms]
    boxes = [box for box in found if box is not None]
    return min(boxes, key=lambda box: box.states, default=None)


def no_box(states: int) -> Box:
    """Of states that nothing bounds."""
    identity = np.eye(states, dtype=np.int64)
    return Box(identity, identity, (), (), ())


def _box(program: Program, channel: int, transform: Integers, steps: FloatArray, words: tuple[tuple[int, int], ...], *,
         plain: bool) -> Box | None:
    limits = bounds(program, channel, transform * steps, plain=plain)[1]
    if not np.isfinite(limits).all():
        return None
    inverse = np.rint(np.linalg.inv(transform)).astype(np.int64)
    assert (inverse @ transform == np.eye(len(steps))).all(), "the transform has determinant 1 or -1"
    reach = np.abs(transform).astype(float) @ np.array([-low for low, _ in words], dtype=float)
    whole = tuple(int(min(limit, most)) for limit, most in zip(limits, reach, strict=True))
    return Box(transform, inverse, tuple(map(float, limits)), whole, words, plain)


def _reduced(program: Program, channel: int, steps: FloatArray) -> Integers | None:
    """Rows of whole numbers that the errors move little; None where no whole numbers of moderate size were found."""
    covariance = _covariance(program, channel) * np.outer(steps, steps)
    size = len(steps)
    transform = np.eye(size, dtype=np.int64)
    if not np.isfinite(covariance).all():
        return None
    for _ in range(64 * size):
        pairs = [(i, j) for i in range(size) for j in range(size) if i != j and covariance[j, j] > 0.0
                 and abs(covariance[i, j]) > 0.5001 * covariance[j, j]]
        if not pairs:
            break
        i, j = max(pairs, key=lambda pair: covariance[pair[0], pair[0]])
        factor = covariance[i, j] / covariance[j, j]
        if not isfinite(factor) or abs(factor) > LARGEST_FACTOR:
            return None
        step = np.eye(size)
        step[i, j] = -round(factor)
        covariance = step @ covariance @ step.T
        transform = np.rint(step).astype(np.int64) @ transform
    return transform if np.abs(transform).max(initial=0) <= LARGEST_FACTOR else None


def _covariance(program: Program, channel: int) -> FloatArray:
    """Of the states, in full scale, that white errors give; not finite where they do not die out."""
    sources = noise_sources(program, channel)
    places = sorted({node for source in sources for node, _ in source.places})
    rows = propagate(program.diagram, channel, places)
    power = np.zeros(len(places))
    for source in sources:
        for node, _ in source.places:
            power[places.index(node)] += source.variance
    covariance, step = (rows.N * power) @ rows.N.T, rows.A
    with np.errstate(over="ignore", invalid="ignore"):
        for _ in range(DOUBLINGS):
            covariance, step = covariance + step @ covariance @ step.T, step @ step
    return covariance
