"""Lowering a diagram into any format, and running the definition on real or integer input."""

from collections.abc import Sequence
from fractions import Fraction
from math import isfinite, isnan

import numpy as np
from numpy.typing import NDArray

from streamhost.diagram.diagram import Diagram
from streamhost.formats import Fixed, Float, Format, Quantizer
from streamhost.program.definition import FixedDefinition
from streamhost.program.float_definition import FloatDefinition
from streamhost.program.floating import lower_float
from streamhost.program.integers import overflowed, rounded_value
from streamhost.program.lowering import lower_fixed
from streamhost.program.program import Program


def lower(diagram: Diagram, format: Format) -> Program:
    """The program of a diagram in a format. Raises FormatError where the two do not go together."""
    if isinstance(format, Float):
        return lower_float(diagram, format)
    return lower_fixed(diagram, format)


def input_code(value: float, quantizer: Quantizer) -> int:
    """A real input as a code; NaN becomes 0, infinity saturates (and becomes 0 where the input wraps)."""
    if isnan(value) or (not isfinite(value) and quantizer.overflow == "wrap"):
        return 0
    if not isfinite(value):
        return quantizer.word.high if value > 0 else quantizer.word.low
    code = rounded_value(Fraction(value), quantizer.word.fraction, quantizer.rounding)
    return overflowed(code, quantizer.word, quantizer.overflow)


def run_definition(program: Program, x: NDArray[np.float64]) -> NDArray[np.float64]:
    """The definition on a real signal (frames, channels): (frames, outputs, channels), from reset."""
    columns = []
    for channel in range(x.shape[1]):
        samples: Sequence[float] = [float(v) for v in x[:, channel]]
        if isinstance(program.format, Fixed):
            quantizer, word = program.format.input, program.format.output.word
            codes = FixedDefinition(program, channel).run([input_code(v, quantizer) for v in samples])
            rows = [[code / 2.0**word.fraction for code in frame] for frame in codes]
        else:
            clean = [0.0 if isnan(v) else v for v in samples]
            rows = [[float(v) for v in frame] for frame in FloatDefinition(program, channel).run(clean)]
        columns.append(np.array(rows, dtype=np.float64).reshape(len(samples), -1))
    return np.stack(columns, axis=2)
