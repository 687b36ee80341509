"""Where a small input meets a large state: how many of its low-order bits the sum drops."""

from collections.abc import Iterator
from math import log2

import numpy as np
from numpy.typing import NDArray

from streamhost.diagram.graph import reachable
from streamhost.diagram.nodes import Delay, Sum
from streamhost.measure.floats.result import LostBits
from streamhost.measure.levels import peak_dbfs
from streamhost.program.program import Program

FloatArray = NDArray[np.float64]

MANTISSA_BITS = {"float32": 24, "float64": 53}
"""IEEE 754 binary32 and binary64, the leading bit among them."""


def lost_bits(program: Program, peaks: FloatArray) -> tuple[LostBits, ...]:
    """Of every sum, the most first; peaks: the largest magnitude of each node, (nodes,)."""
    return tuple(sorted(_of_sums(program, peaks), key=lambda each: -each.lost_bits))


def _of_sums(program: Program, peaks: FloatArray) -> Iterator[LostBits]:
    nodes = program.nodes
    readers = [[reader for reader in each if not isinstance(nodes[reader], Delay)] for each in program.diagram.readers]
    direct = set(reachable(readers, program.diagram.inputs))
    for index, node in enumerate(nodes):
        if not isinstance(node, Sum) or len(node.terms) < 2:
            continue
        of_input = [peaks[term.source] for term in node.terms if term.source in direct and peaks[term.source] > 0.0]
        if not of_input:
            continue
        largest, smallest = max(peaks[index], *(peaks[term.source] for term in node.terms)), min(of_input)
        if not np.isfinite(largest):
            continue
        yield LostBits(node.label, peak_dbfs(float(largest)), peak_dbfs(float(smallest)), log2(largest / smallest),
                       MANTISSA_BITS[program.types[index]])
