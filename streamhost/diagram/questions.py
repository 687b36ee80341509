"""Two questions that are not one: whether a diagram is recursive, and whether its impulse response ends."""

from itertools import islice

import numpy as np

from streamhost.diagram.diagram import Diagram
from streamhost.diagram.difference import difference
from streamhost.diagram.exact import RATIONALS, RESIDUES, Numbers, impulse_responses
from streamhost.diagram.graph import loops


def has_loop(diagram: Diagram) -> bool:
    """Whether some value depends on its own past, through whatever edges; a residue's edge counts."""
    return bool(loops(diagram.readers))


def response_ends(diagram: Diagram) -> bool:
    """Whether every impulse response, of every channel, is of finite length, in exact arithmetic on the coefficients.

    By the theorem of Cayley and Hamilton a response of S states obeys a recursion of order S, so that it has ended
    if and only if frames S+1 to 2S are 0.
    """
    if not has_loop(diagram):
        return True
    pairs = [(channel, i) for channel in _different_channels(diagram) for i in range(len(diagram.inputs))]
    # What is not 0 modulo a prime is not 0: the cheap run says no, only a yes is worth the dear one.
    return all(_has_ended(diagram, *pair, numbers) for numbers in (RESIDUES, RATIONALS) for pair in pairs)


def response_frames(diagram: Diagram) -> int | None:
    """Frames of the longest impulse response, 0 where all are 0; None where one does not end."""
    if not response_ends(diagram):
        return None
    channels = _different_channels(diagram)
    if not has_loop(diagram):
        # then there is no denominator, and a numerator is the response: a long line need not be run
        return max((len(numerator) for channel in channels for output in diagram.outputs
                    for numerator in difference(diagram, output, channel).numerators), default=0)
    runs = [islice(impulse_responses(diagram, channel, i), diagram.counts().delays + 1)
            for channel in channels for i in range(len(diagram.inputs))]
    return max((frame for run in runs for frame, values in enumerate(run, 1) if any(values)), default=0)


def _different_channels(diagram: Diagram) -> list[int]:
    if not diagram.slots:
        return [0]
    first: list[int] = np.unique(diagram.values, axis=1, return_index=True)[1].tolist()
    return first


def _has_ended(diagram: Diagram, channel: int, input_: int, numbers: Numbers) -> bool:
    states = diagram.counts().delays
    late = islice(impulse_responses(diagram, channel, input_, numbers), states + 1, 2 * states + 1)
    return not any(any(frame) for frame in late)
