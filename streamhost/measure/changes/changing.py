"""A change between two realizations at a frame, by each changeover, on many excerpts side by side.

The same states as the host's (a test holds the two together to the bit), from one run of each realization before the
change; channels stand for excerpts, so that one kernel call runs them all.
"""

import copy
from collections.abc import Sequence
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from streamhost.errors import RequestError
from streamhost.host.records import BANK_FRAMES
from streamhost.program.carrying import Bridge, bridge, frames_of_history, is_run
from streamhost.program.native.kernel import Kernel, Memory, Variant, compile_kernel, kernel_width, no_marks, no_trace
from streamhost.program.states import read_states, write_states
from streamhost.realization import Realization

FloatArray = NDArray[np.float64]

RAMP = "ramp"

NOT_KEPT = "the two differ in diagram or words, and a state cannot be kept"
NO_RAMP = "there is no parameter to move along"


class Runner:
    """Runs a realization on excerpts, in memories that are given. Its own state is not touched."""

    def __init__(self, realization: Realization, columns: int) -> None:
        realization.check_samples()
        self.realization, self.program = realization, realization.program
        self._columns, self._outputs = columns, len(realization.outputs)
        self._kernel: Kernel = compile_kernel(self.program, Variant(width=kernel_width(self.program, columns)))

    def memory(self) -> Memory:
        """Of zero state."""
        return self.realization.memory(self._columns)

    def run(self, memory: Memory, x: FloatArray) -> FloatArray:
        """The next frames (frames, columns); (frames, outputs * columns)."""
        y = np.empty((len(x), self._outputs * self._columns))
        self._kernel.call(memory, np.ascontiguousarray(x), y, marks=no_marks(), trace=no_trace())
        return y


class Changing:
    """From one realization to another. `ramp`: the realizations on the way, the last of which is the other one."""

    def __init__(self, before: Realization, after: Realization, ramp: Sequence[Realization] = ()) -> None:
        self.before, self.after, self.ramp = before, after, tuple(ramp)
        self._runners: dict[tuple[int, int], Runner] = {}

    def runner(self, realization: Realization, columns: int) -> Runner:
        """For one of these realizations, made once."""
        key = id(realization), columns
        if key not in self._runners:
            self._runners[key] = Runner(realization, columns)
        return self._runners[key]

    def why_not(self, changeover: str) -> str:
        """Why a changeover cannot be; empty where it can."""
        if changeover == RAMP and not self.ramp:
            return NO_RAMP
        passed = self.ramp if changeover == RAMP else (self.after,)
        if changeover in ("keep", RAMP) and any(each.program.key != self.before.program.key for each in passed):
            return NOT_KEPT
        if changeover == "carry":
            try:
                _ = self.bridge
            except RequestError as error:
                return str(error).rstrip(".")
        return ""

    @cached_property
    def bridge(self) -> Bridge | None:
        """What carries the state; None where the other is run over its last inputs instead."""
        if is_run(self.after.program):
            return None
        return bridge(self.before.program, self.after.program, self.before.rate)

    def on(self, x: FloatArray, frame: int) -> "Change":
        """Run both on excerpts (frames, columns), the change being at that frame of each."""
        return Change(self, x, frame)


class Change:
    """A change on excerpts. before, target: (frames, outputs * columns), of each realization had it run all along."""

    def __init__(self, changing: Changing, x: FloatArray, frame: int) -> None:
        self._changing, self.frame, self._x = changing, frame, x
        columns = x.shape[1]
        self._first, self._second = (changing.runner(each, columns) for each in (changing.before, changing.after))
        memory = self._first.memory()
        head = self._first.run(memory, x[:frame])
        self._state = copy.deepcopy(memory)
        self.before = np.vstack([head, self._first.run(memory, x[frame:])])
        self.target = self._second.run(self._second.memory(), x)

    def after(self, changeover: str, over: int) -> tuple[FloatArray, int]:
        """The output from the change on, and how many carried states did not fit; over: frames that a fade takes."""
        rest = self._x[self.frame :]
        if changeover == "warm":
            return self.target[self.frame :], 0
        if changeover == "fade":
            return self._faded(over), 0
        if changeover == RAMP:
            return self._ramped(rest), 0
        memory, clipped = self._second.memory(), 0
        if changeover == "keep":
            memory.state[:], memory.frame = self._state.state, self._state.frame
        elif changeover == "carry":
            clipped = self._carry(memory)
        return self._second.run(memory, rest), clipped

    def _faded(self, over: int) -> FloatArray:
        share = np.minimum(np.arange(1, len(self._x) - self.frame + 1) / (over + 1), 1.0)[:, None]
        share[over:] = 1.0
        return np.asarray(self.target[self.frame :] * share + self.before[self.frame :] * (1.0 - share))

    def _ramped(self, rest: FloatArray) -> FloatArray:
        memory, found, done = copy.deepcopy(self._state), [], 0
        for each in self._changing.ramp:
            memory.coefficients[:] = each.memory(rest.shape[1]).coefficients
            last = each is self._changing.ramp[-1]
            part = rest[done:] if last else rest[done : done + BANK_FRAMES]
            found.append(self._changing.runner(each, rest.shape[1]).run(memory, part))
            done += len(part)
        return np.vstack(found)

    def _carry(self, memory: Memory) -> int:
        program = self._changing.after.program
        needed = program.state_words if is_run(program) else frames_of_history(program)
        missing = np.zeros((max(0, needed - self.frame), self._x.shape[1]))
        past = np.vstack([missing, self._x[max(0, self.frame - needed) : self.frame]])
        solved = self._changing.bridge
        if solved is None:
            self._second.run(memory, past)
            return 0
        first = self._changing.before.program
        same = first.key == program.key and np.array_equal(self._state.coefficients, memory.coefficients)
        if same:
            memory.state[:], memory.frame = self._state.state, self._state.frame
            return 0
        states, _ = solved.carry(read_states(first, self._state), past)
        return write_states(program, memory, states)
