"""The roundings of a floating-point program as noise: an estimate, since they grow and shrink with the signal."""

import numpy as np

from streamhost.diagram.nodes import Round
from streamhost.diagram.norms import response_to_output
from streamhost.formats import Float
from streamhost.program.program import Program
from streamhost.program.sources import FloatArray

FLOAT_ERROR = 0.18
"""Mean square of a rounding's relative error in units of the unit roundoff squared, for mantissas spread as a signal's
are: a uniform error in the last place over a logarithmically uniform mantissa gives (1/3) * (3/8) / ln 2 = 0.18."""

UNITS = {"float32": 2.0**-24, "float64": 2.0**-53}
"""Unit roundoffs of IEEE 754 binary32 and binary64."""


def float_errors(program: Program, rms: FloatArray) -> dict[int, float]:
    """The mean square of the error that each node adds, by node; `rms` is that of every node's value, (nodes,).

    A multiplication, an addition and a conversion is one rounding each, relative to the node's value.
    """
    assert isinstance(program.format, Float), "a floating-point program"
    found = {}
    for index, node in enumerate(program.nodes):
        converts = isinstance(node, Round) and program.format.sum_type != program.format.type
        operations = node.multiplications + node.additions + converts
        if operations:
            unit = UNITS[program.format.type if converts else program.format.sum_type]
            found[index] = operations * FLOAT_ERROR * unit**2 * float(rms[index]) ** 2
    return found


def float_spectrum(
    program: Program, rms: FloatArray, frequencies: FloatArray, channel: int = 0, output: int = 0
) -> FloatArray:
    """Estimated power density of the noise at an output, as `noise_spectrum` has it."""
    errors = float_errors(program, rms)
    if not errors:
        return np.zeros(len(frequencies))
    power = np.abs(response_to_output(program.diagram, list(errors), frequencies, channel, output=output)) ** 2
    return np.asarray(power @ np.array(list(errors.values())), dtype=np.float64)
