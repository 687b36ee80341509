"""What the step needs to carry a state at a frame: the matrix of `program/carrying.py`, and where states lie in memory."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from streamhost.host.lane import Lane
from streamhost.host.records import CARRY
from streamhost.program.carrying import bridge
from streamhost.program.program import Program
from streamhost.program.states import rings

POINTERS = ("high", "low", "past", "free", "reads", "writes", "steps", "given", "bounds", "types")
"""The fields of a CARRY record that hold addresses, in the order in which their arrays are kept."""


@dataclass(frozen=True)
class Prepared:
    """A CARRY record and all that it points to. `record` None: the states are copied as they are.

    It may be sent to another process, where the record points to the arrays that have come with it.
    """

    record: NDArray[np.void] | None
    arrays: tuple[NDArray[np.generic], ...] = ()
    past_frames: int = 0

    @property
    def address(self) -> int:
        return int(self.record.ctypes.data) if self.record is not None else 0

    def __reduce__(self) -> "tuple[object, ...]":
        return _pointed, (self.record, self.arrays, self.past_frames)


def _pointed(record: NDArray[np.void] | None, arrays: tuple[NDArray[np.generic], ...], past_frames: int) -> Prepared:
    """With the addresses of these arrays in the record."""
    if record is not None:
        for name, array in zip(POINTERS, arrays, strict=True):
            record[name] = array.ctypes.data
    return Prepared(record, arrays, past_frames)


def prepare_carry(before: Lane, following: Lane) -> Prepared:
    """Solve for the state of the lane that takes over. RequestError where the two have no output in common.

    The step then computes what `Realization.carry_from` computes, operation for operation.
    """
    first, second = before.realization.program, following.realization.program
    old, new = (lane.realization.memory(lane.channels).coefficients for lane in (before, following))
    if first.key == second.key and np.array_equal(old, new):
        return Prepared(None)
    solved = bridge(first, second, before.realization.rate)
    size = first.state_words + len(solved.past)
    steps = np.concatenate([_steps(first), 1.0 / np.where(_steps(second) == 0.0, 1.0, _steps(second))])
    arrays = {
        "high": np.array([channel.M.high for channel in solved.channels]),
        "low": np.array([channel.M.low for channel in solved.channels]),
        "past": np.array([(state, ago) for state, _, ago in solved.past], np.int64),
        "free": np.array(solved.free, np.int64),
        "reads": _rows(first), "writes": _rows(second), "steps": steps, "given": np.zeros(size),
        "bounds": _tops(second), "types": _types(second),
    }
    record = np.zeros(1, CARRY)
    kept = tuple(np.ascontiguousarray(arrays[name]) for name in POINTERS)
    record["before"], record["pasts"], record["frees"] = first.state_words, len(solved.past), len(solved.free)
    record["states"], record["sets"] = second.state_words, len(solved.channels)
    furthest = max((ago for _, _, ago in solved.past), default=0)
    return _pointed(record, kept, furthest)


def _rows(program: Program) -> NDArray[np.int64]:
    """(offset, stores, k) of each state."""
    return np.array([(ring.offset, ring.stores, ring.k) for ring in rings(program)], np.int64).reshape(-1, 3)


def _steps(program: Program) -> NDArray[np.float64]:
    """The value of a code of each state; 0 where states are floats."""
    return np.array([2.0 ** -program.numbers[ring.source].fraction if program.numbers else 0.0 for ring in rings(program)])


def _tops(program: Program) -> NDArray[np.int64]:
    return np.array([program.numbers[ring.source].bound - 1 if program.numbers else 0 for ring in rings(program)], np.int64)


def _types(program: Program) -> NDArray[np.int64]:
    kinds = {"float64": 0, "float32": 1}
    return np.array([2 if program.numbers else kinds[program.types[ring.source]] for ring in rings(program)], np.int64)
