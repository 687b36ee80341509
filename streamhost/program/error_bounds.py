"""How far the roundings of a part can hold it from 0 when it goes on by itself.

In a state that comes back, nothing but the roundings' errors is left of the past, and none of them exceeds its largest:
a value is at most the sum over the sources of the L1 norm of its response to the source times that largest error (I. W.
Sandberg and J. F. Kaiser, IEEE Transactions on Audio and Electroacoustics 20, 1972; from memory). It holds for every limit
cycle without input in which nothing overflows.
"""

import numpy as np
from numpy.typing import NDArray

from streamhost.diagram.fan import Fan
from streamhost.diagram.norms import absolute_sums
from streamhost.diagram.rows import Rows, propagate
from streamhost.program.program import Program
from streamhost.program.sources import Source, noise_sources, separate_sources

FloatArray = NDArray[np.float64]

MARGIN = 1e-6
"""What the bounds are raised by, relative: far more than float64 loses on the way."""


def bounds(program: Program, channel: int = 0, combinations: FloatArray | None = None, *, plain: bool = False
           ) -> tuple[FloatArray, FloatArray]:
    """Bounds of the node values, (nodes,), in full scale, and of linear combinations of the states, (combinations,).

    combinations: (combinations, states), of states in full scale; None for the states themselves. Infinite where an
    error does not die out. `plain`: larger ones, of sources that are easy to check (`separate_sources`).
    """
    sources = separate_sources(program, channel) if plain else noise_sources(program, channel)
    places = sorted({node for source in sources for node, _ in source.places})
    rows = propagate(program.diagram, channel, places)
    wanted = np.eye(len(rows.A)) if combinations is None else combinations
    total = np.zeros(len(program.nodes) + len(wanted))
    for source in sources:
        total += source.largest * absolute_sums(_fan(rows, source, places, wanted))
    total *= 1.0 + MARGIN
    return total[: len(program.nodes)], total[len(program.nodes) :]


def _fan(rows: Rows, source: Source, places: list[int], combinations: FloatArray) -> Fan:
    """From one error to all nodes and combinations; what comes to a place later has been through a chain of states."""
    states, oldest = len(rows.A), max(delay for _, delay in source.places)
    A = np.zeros((states + oldest, states + oldest))
    A[:states, :states] = rows.A
    A[states + 1 :, states:-1] = np.eye(max(0, oldest - 1))
    entry, direct = np.zeros(states + oldest), np.zeros(len(rows.F) + len(combinations))
    entry[states : states + 1] = 1.0
    exits = np.zeros((len(direct), states + oldest))
    exits[: len(rows.F), :states], exits[len(rows.F) :, :states] = rows.F, combinations
    for node, delay in source.places:
        column = places.index(node)
        if delay:
            A[:states, states + delay - 1] += rows.N[:, column]
            exits[: len(rows.F), states + delay - 1] += rows.E[:, column]
        else:
            entry[:states] += rows.N[:, column]
            direct[: len(rows.F)] += rows.E[:, column]
    return Fan(A, entry, exits, direct)
