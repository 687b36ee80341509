"""What errors made at nodes of a diagram come to at an output: norms and powers."""

from collections.abc import Sequence

import numpy as np

from streamhost.diagram import Diagram
from streamhost.diagram import fan as fans
from streamhost.diagram.course import follow
from streamhost.diagram.norms import Norms, norms_of


def norms_to_output(diagram: Diagram, sources: Sequence[int], *, output: int = 0) -> Norms:
    """Norms of the responses from errors at the source nodes to an output."""
    return norms_of(fans.to_output(diagram, sources, output=output))


def noise_gains(diagram: Diagram, sources: Sequence[int]) -> np.ndarray:
    """The power at the first output of white errors of power 1 at the source nodes, (sources,): L2^2, without the rest."""
    return follow(fans.to_output(diagram, sources)).energy
