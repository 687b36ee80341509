"""What float64 may do to a form's output, from its own diagram."""

import numpy as np

from streamhost.diagram import Diagram
from streamhost.diagram.norms import powers_from_input, responses_to_output

EPSILON = 2.0**-52


def rounding_bound(diagram: Diagram, frames: int = 2000) -> float:
    """The most that one rounding of each node, and of each coefficient, makes at the output in so many frames.

    A node's value is taken as six times what white noise of power 1 gives it. Doubled for the other side's own roundings,
    of the same kind.
    """
    values = 6.0 * np.sqrt(powers_from_input(diagram))
    to_output = np.abs(responses_to_output(diagram, range(len(diagram.nodes)), frames=frames)).sum(axis=0)
    return 2.0 * 2.0 * EPSILON * float(np.sum(values * to_output))
