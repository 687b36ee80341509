"""Carrying the state of one running program into another, so that the output goes on."""

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from streamhost.diagram.carrying import (
    Continuation,
    continuation,
    looked_at,
    outputs_alone,
    past_input,
    residue_states,
)
from streamhost.diagram.linear import state_space
from streamhost.errors import RequestError
from streamhost.program.program import Program
from streamhost.program.states import read_states, write_states

if TYPE_CHECKING:
    from streamhost.program.native.kernel import Memory

FloatArray = NDArray[np.float64]

MOST_SOLVED = 300
"""States above which a diagram whose response ends is run over the last inputs instead."""


@dataclass(frozen=True)
class Carried:
    """How well one realization's state was carried into another.

    `way`: "copied" between equal programs; "solved"; or "run", over the last inputs: see `is_run`.
    `missed`: the largest deviation of the output, were there no more input, from what would have come, 1.0 = full scale;
    None where it was run. `clipped`: how many states did not fit their word and were saturated.
    """

    way: str
    missed: float | None
    clipped: int


@dataclass(frozen=True)
class Bridge:
    """What is prepared for carrying from one program to another, of each channel of coefficients.

    The state before is followed by the past input that `past` names, (state, input, frames ago) of the program that takes
    over; `free` are its states that are solved for, those left are 0.
    """

    past: tuple[tuple[int, int, int], ...]
    free: tuple[int, ...]
    states: int
    channels: tuple[Continuation, ...]

    def carry(self, before: FloatArray, history: FloatArray) -> tuple[FloatArray, float]:
        """(states, channels) of the program that takes over, and the largest deviation of the output.

        before: (states, channels); history: (frames, channels) of past input, oldest first, as long as `past` asks.
        """
        channels = before.shape[1]
        known = np.array([history[-ago] for _, _, ago in self.past]).reshape(len(self.past), channels)
        stacked, after, missed = np.vstack([before, known]), np.zeros((self.states, channels)), 0.0
        after[[state for state, _, _ in self.past]] = known
        for channel in range(channels):
            solved = self.channels[channel if len(self.channels) > 1 else 0]
            column = stacked[:, channel : channel + 1]
            after[list(self.free), channel] = solved.state(column)[:, 0]
            missed = max(missed, solved.missed(column))
        return after, missed


def bridge(before: Program, following: Program, rate: float) -> Bridge:
    """Prepare to carry states; RequestError where the two have no output in common."""
    common = _common_outputs(before, following)
    held, silent = past_input(following.diagram), residue_states(following.diagram)
    past = tuple((state, *held[state]) for state in sorted(held))
    free = tuple(state for state in range(following.state_words) if state not in held and state not in silent)
    channels = max(before.diagram.channels, following.diagram.channels)
    solved = []
    for channel in range(channels):
        spaces = [state_space(program.diagram, min(channel, program.diagram.channels - 1)) for program in (before, following)]
        frames = looked_at(spaces, rate)
        first = outputs_alone(spaces[0], [pair[0] for pair in common], frames)
        second = outputs_alone(spaces[1], [pair[1] for pair in common], frames)
        given = first.beside(-second.columns([state for state, _, _ in past]))
        solved.append(continuation(given, second.columns(free), frames.weights(len(common))))
    return Bridge(past, free, following.state_words, tuple(solved))


def carry(before: Program, memory: "Memory", following: Program, into: "Memory", rate: float,
          history: FloatArray) -> Carried:
    """Put the state in one program's memory into that of another, which is at frame 0.

    history: (frames, channels) of past input, oldest first, of which the last `frames_of_history(following)` are used;
    what is missing before them counts as silence.
    """
    if before.key == following.key and np.array_equal(memory.coefficients, into.coefficients):
        into.state[:] = memory.state
        into.frame = memory.frame
        return Carried("copied", 0.0, 0)
    missing = max(0, frames_of_history(following) - len(history))
    past = np.vstack([np.zeros((missing, memory.channels)), history])
    states, missed = bridge(before, following, rate).carry(read_states(before, memory), past)
    return Carried("solved", missed, write_states(following, into, states))


def frames_of_history(program: Program) -> int:
    """How many frames of past input the states of a program hold."""
    return max((ago for _, ago in past_input(program.diagram).values()), default=0)


def is_run(program: Program) -> bool:
    """Whether the state is made by running the program over its last inputs.

    That is where its response ends and is long, or ends only because zeros cancel poles, as in a running sum: a state that
    no input makes, and be it off by the last bit, might never die there.
    """
    return (program.state_words > MOST_SOLVED or program.diagram.has_loop()) and program.diagram.response_ends()


def _common_outputs(before: Program, following: Program) -> list[tuple[int, int]]:
    names = [[program.nodes[index].label for index in program.diagram.outputs] for program in (before, following)]
    common = [(names[0].index(name), place) for place, name in enumerate(names[1]) if name in names[0]]
    if not common:
        raise RequestError(
            f"A state is carried so that an output goes on, and the two realizations have none in common: "
            f"{', '.join(names[0])} and {', '.join(names[1])}."
        )
    return common
