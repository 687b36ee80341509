"""Poles and zeros as asked and as stored, paired, and the steps from pole to pole that stored coefficients allow."""

from collections.abc import Iterable, Sequence
from itertools import chain
from math import hypot, pi

import numpy as np
from numpy.typing import NDArray

from streamhost.diagram.graph import loops
from streamhost.diagram.nodes import Gain
from streamhost.diagram.rows import FloatArray, propagate
from streamhost.diagram.transfer import exact_transfer_function
from streamhost.errors import DiagramError
from streamhost.filters import Filter
from streamhost.filters.exact import stripped
from streamhost.filters.roots import roots
from streamhost.measure.realized.result import Root, Step
from streamhost.program.poles import denominators
from streamhost.realization import Realization

MOST_ROOTS = 32
"""Of one polynomial, whose roots are found in 400 bits."""
MOST_WORK = 1e9
DIFFERENCE = 2.0**-10
"""A coefficient is moved by so much to both sides: the matrix is of first or second degree in it, so nothing is lost."""

Known = tuple[tuple[Root, ...], str]


def poles_of(realization: Realization, channel: int) -> Known:
    """The poles of a channel but for those at 0, paired, with their steps; or none of them and the reason."""
    stored = denominators(realization.program.diagram, channel)
    filter = realization.filters[min(channel, len(realization.filters) - 1)]
    parts = [filter.common, *(branch.filter for branch in filter.branches)]
    if max([len(each) - 1 for each in stored] + [part.order for part in parts if part.is_recursive], default=0) > MOST_ROOTS:
        return (), f"a loop has more than {MOST_ROOTS} poles, which are not solved for"
    asked = chain.from_iterable(part.zeros_poles().poles for part in parts if part.is_recursive)
    found = [root for each in stored for root in roots(each)]
    steps = pole_steps(realization, channel)
    return _paired(asked, found, realization.rate, steps), ""


def zeros_of(realization: Realization, channel: int, output: int) -> Known:
    """The zeros to an output but for those at 0, paired; or none of them and the reason."""
    filter = realization.filters[min(channel, len(realization.filters) - 1)]
    name = realization.outputs[output]
    whole = _output_of(filter, name, realization)
    if whole is None:
        return (), "the filter does not ask for this output; the form alone gives it"
    counts = realization.diagram.counts()
    if max(whole.order, counts.delays) > MOST_ROOTS:
        return (), f"there may be more than {MOST_ROOTS} zeros, which are not solved for"
    try:
        exact = exact_transfer_function(realization.program.diagram, channel, most_work=MOST_WORK)
    except DiagramError:
        return (), "the coefficients have too many digits for the zeros to be told exactly"
    numerator = exact.numerators[output][0]
    first = next((place for place, value in enumerate(numerator) if value), None)
    found = roots(stripped(numerator[first:])) if first is not None else ()
    return _paired(whole.zeros_poles().zeros, found, realization.rate, []), ""


def _output_of(filter: Filter, name: str, realization: Realization) -> Filter | None:
    if len(filter.outputs) < len(realization.outputs):
        return None
    return filter.output(name) if filter.branches else filter


def _paired(
    asked: Iterable[complex], stored: Sequence[complex], rate: float, steps: Sequence[tuple[complex, tuple[Step, ...]]]
) -> tuple[Root, ...]:
    """Each with the partner that makes all distances together least; of conjugates the upper ones, largest radius first."""
    wanted = list(asked)
    partners = dict(_matching(stored, wanted))
    pairs: list[tuple[complex | None, complex | None]] = [
        (wanted[partners[place]] if place in partners else None, root) for place, root in enumerate(stored)]
    pairs += [(wanted[k], None) for k in sorted(set(range(len(wanted))) - set(partners.values()))]
    upper = [pair for pair in pairs if _known(pair).imag >= 0.0]
    return tuple(_root(*pair, rate, steps) for pair in sorted(upper, key=lambda pair: -abs(_known(pair))))


def _known(pair: tuple[complex | None, complex | None]) -> complex:
    known = pair[1] if pair[1] is not None else pair[0]
    assert known is not None, "one of a pair is there"
    return known


def _matching(first: Sequence[complex], second: Sequence[complex]) -> list[tuple[int, int]]:
    """Pairs of places with the least distances together (H. W. Kuhn, 1955); the rest of the longer one stays alone."""
    if not len(first) or not len(second):
        return []
    from scipy.optimize import linear_sum_assignment

    distances = np.abs(np.array(first)[:, None] - np.array(second))
    return [(int(i), int(k)) for i, k in zip(*linear_sum_assignment(distances), strict=True)]


def _root(
    asked: complex | None, stored: complex | None, rate: float, steps: Sequence[tuple[complex, tuple[Step, ...]]]
) -> Root:
    if stored is None:
        assert asked is not None, "one of a pair is there"
        return Root(asked.real, asked.imag, None, None, None, None, None)
    nearest = min(steps, key=lambda step: abs(step[0] - stored), default=None)
    return Root(
        asked_real=None if asked is None else asked.real,
        asked_imaginary=None if asked is None else asked.imag,
        stored_real=stored.real,
        stored_imaginary=stored.imag,
        radius=abs(stored),
        hz=abs(float(np.angle(stored))) * rate / (2.0 * pi),
        moved=None if asked is None else abs(stored - asked),
        steps=nearest[1] if nearest is not None else (),
    )


def pole_steps(realization: Realization, channel: int) -> list[tuple[complex, tuple[Step, ...]]]:
    """Every eigenvalue of the loops of states, and how it moves with each coefficient: dp/dc = u (dA/dc) v / (u v).

    For A(z) in direct form that is Kaiser's -p^(N-k) / prod(p - p_j). Infinite, or as good as, where poles coincide.
    """
    diagram = realization.program.diagram
    A = propagate(diagram, channel).A
    members = loops([np.flatnonzero(row).tolist() for row in A])
    slopes = [(slot, _slope(realization, channel, slot))
              for slot in sorted({node.coefficient for node in diagram.nodes if isinstance(node, Gain)})] if members else []
    found = []
    for loop in members:
        own = np.ix_(loop, loop)
        values, right = np.linalg.eig(A[own])
        left = _inverse(right)
        moving = sorted([(slot, slope[own]) for slot, slope in slopes if slope[own].any()],
                        key=lambda each: diagram.slots[each[0]].label)
        for k, pole in enumerate(values):
            derivatives = [(slot, complex(left[k] @ slope @ right[:, k])) for slot, slope in moving]
            found.append((complex(pole), tuple(_step(realization, channel, *each) for each in derivatives)))
    return found


def _inverse(right: NDArray[np.complex128]) -> NDArray[np.complex128]:
    try:
        return np.asarray(np.linalg.inv(right), dtype=np.complex128)
    except np.linalg.LinAlgError:
        return np.full_like(right, np.inf)


def _slope(realization: Realization, channel: int, slot: int) -> FloatArray:
    """dA/dc."""
    diagram = realization.program.diagram
    moved = []
    for side in (DIFFERENCE, -DIFFERENCE):
        values = diagram.values.copy()
        values[slot] += side
        moved.append(propagate(diagram.with_values(values), channel).A)
    return np.asarray((moved[0] - moved[1]) / (2.0 * DIFFERENCE))


def _step(realization: Realization, channel: int, slot: int, derivative: complex) -> Step:
    step = _least_step(realization, channel, slot)
    moves = hypot(derivative.real, derivative.imag) * step
    label = realization.program.diagram.slots[slot].label
    return Step(label, derivative.real, derivative.imag, step, moves, moves * realization.rate / (2.0 * pi))


def _least_step(realization: Realization, channel: int, slot: int) -> float:
    """One step of the coefficient's word, or to the next number of its type."""
    program = realization.program
    if program.stored is not None:
        return float(2.0 ** -program.stored.words[slot].fraction)
    assert not hasattr(program.format, "signal"), "fixed point stores codes"
    value = abs(float(program.diagram.values[slot, channel]))
    return float(np.spacing(np.float32(value))) if program.format.type == "float32" else float(np.spacing(value))
