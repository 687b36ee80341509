"""The rounding noise of a form, from its diagram, as its explanation states it."""

import re

import numpy as np
from error_norms import norms_to_output

from streamhost import Fixed, design, realize
from streamhost.structures import form

RATE = 48000


def noise_gain_db(name: str, kind: str, frequency: float) -> float:
    """White noise of the power of one rounding at every rounding of a filter of Q 0.707: its power at the output, in dB.

    Drawn whole, scaled `l2`, all words of one length, so that no rounding counts more than another.
    """
    filter = design(kind, rate=RATE, frequency=frequency, q=0.707)
    format = Fixed("Q8.24", coefficients={"bits": 32})
    program = realize(filter, form=name, decomposition="whole", scaling="l2", format=format).program
    return float(10 * np.log10(np.sum(norms_to_output(program.diagram, program.roundings).l2 ** 2)))


def stated(name: str, figure: str) -> bool:
    """Whether an explanation has a figure, in dB or in a list of figures before it."""
    return re.search(rf"(?<![\d.]){re.escape(figure)}(?![\d.])", form(name).docs) is not None
