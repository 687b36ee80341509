"""One loop of a program alone, without input: its bound, its box walked or its states searched."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from streamhost.diagram.nodes import Delay, Gain, Round
from streamhost.measure.cycles.boxes import Box, box_of
from streamhost.measure.cycles.exhaustion import MOST_STATES, MOST_STATES_QUICK, exhaust
from streamhost.measure.cycles.results import Listed
from streamhost.measure.cycles.search import follow
from streamhost.measure.cycles.seeded import anywhere, inside
from streamhost.measure.naming import rounding_name
from streamhost.program.autonomous import Part, part_of
from streamhost.program.error_bounds import bounds
from streamhost.program.native.batches import Batch
from streamhost.program.poles import unstable_poles_in
from streamhost.program.program import Program

Integers = NDArray[np.int64]
Report = Callable[[float, str], None]

LANES, LANES_QUICK = 4096, 512
STEPS, STEPS_QUICK = 1 << 30, 1 << 26
SLOW = 16
"""What a step of two-word arithmetic costs, in steps of one-word arithmetic, about."""


@dataclass(frozen=True)
class Effort:
    """How much is tried: states that are walked at most, states that are searched from, steps of all of them together."""

    box: int = MOST_STATES
    lanes: int = LANES
    steps: int = STEPS
    seed: int = 1

    @classmethod
    def quick(cls, seed: int) -> "Effort":
        return cls(MOST_STATES_QUICK, LANES_QUICK, STEPS_QUICK, seed)


@dataclass(frozen=True, eq=False)
class Examined:
    """A section's figures, before anything is said of outputs.

    known: cycles from the walk, all there are in the box; met: one of each kind that the search met. `register` is the
    node in whose steps amplitudes are given, `bound` what holds it.
    """

    name: str
    part: Part
    box: Box | None
    register: int
    bound: float | None
    reason: str
    walked: bool
    known: Listed
    met: Listed
    searched: int
    unresolved: int
    complete: bool


def examine(program: Program, loop: tuple[int, ...], channel: int, effort: Effort, report: Report) -> Examined:
    """A loop that has no lines. See `results.SectionCycles`."""
    part, name = part_of(program, loop), section_name(program, loop)
    registers = registers_of(program, part)
    stable = not unstable_poles_in(part.program.diagram)
    box = _box(part.program, channel, effort) if stable else None
    reason = _reason(stable, box, effort)
    batch = Batch(part.program, registers, channel)
    walked, complete, known = False, True, _nothing(part, registers)
    if box is not None and box.states <= effort.box:
        found = exhaust(part.program, box, channel, lambda share: report(share / 2, f"walking {name}"))
        walked = complete = found.complete
        known, _, _ = _listed(batch, found.states, lambda share: None, effort)
    met, unresolved, searched = _nothing(part, registers), 0, 0
    if complete and not (walked and box is not None and box.holds_all):
        states = _states(part.program, None if walked else box, effort)
        met, unresolved, complete = _listed(batch, states, lambda share: report(0.5 + share / 2, f"searching {name}"), effort)
        met, searched = one_of_each(met), states.shape[1]
    register, bound = _register(part.program, registers, channel, box, met)
    return Examined(name, part, box, register, bound, reason, walked, known, met, searched, unresolved, complete)


def _box(program: Program, channel: int, effort: Effort) -> Box | None:
    """The box that a certificate's reader can check; the smaller one if it must be."""
    box = box_of(program, channel, plain=True)
    return box if box is None or box.states <= effort.box else box_of(program, channel)


def _reason(stable: bool, box: Box | None, effort: Effort) -> str:
    if not stable:
        return "a pole lies on or outside the unit circle: errors do not die out, and nothing bounds them"
    if box is None:
        return "the response to its roundings could not be bounded"
    if box.states > effort.box:
        return f"the bound leaves {box.states} states, more than the {effort.box} that are walked"
    return ""


def section_name(program: Program, loop: Sequence[int]) -> str:
    """"section 2", by the coefficients in the loop."""
    slots = [program.diagram.slots[node.coefficient] for index in loop if isinstance(node := program.nodes[index], Gain)]
    numbers = sorted({slot.section + 1 for slot in slots if slot.section is not None})
    if not numbers:
        return f"the loop of {program.nodes[min(loop)].label}"
    return f"section{'s' if len(numbers) > 1 else ''} {', '.join(map(str, numbers))}"


def registers_of(program: Program, part: Part) -> tuple[int, ...]:
    """The registers of a part, those that a delay reads first; what only shortens an operand is none."""
    nodes = part.program.nodes
    read = {node.source for node in nodes if isinstance(node, Delay)}
    rounds = [index for index, node in enumerate(nodes) if isinstance(node, Round)]
    kept = [index for index in rounds if index in read]
    others = [index for index in rounds if index not in read
              and rounding_name(program, part.origins[index]).startswith("the register")]
    return (*kept, *others) or tuple(rounds) or (nodes.index(next(node for node in nodes if isinstance(node, Delay))),)


def _states(program: Program, box: Box | None, effort: Effort) -> Integers:
    """Half of them anywhere and half in the box that was too large to be walked, or all of them anywhere."""
    if box is None:
        return anywhere(program, effort.lanes, effort.seed)
    half = effort.lanes // 2
    return np.hstack((anywhere(program, half, effort.seed), inside(box, half, effort.seed + 1)))


def _nothing(part: Part, registers: tuple[int, ...]) -> Listed:
    none = np.zeros(0, np.int64)
    return Listed(np.zeros((len(part.words), 0), np.int64), none, registers, np.zeros((len(registers), 0), np.int64),
                  none.astype(np.bool_))


def _listed(batch: Batch, states: Integers, report: Callable[[float], None], effort: Effort) -> tuple[Listed, int, bool]:
    """The cycles that states end in, other than 0 for ever, the states that ended in none, and whether all is done."""
    steps = max(effort.steps // (1 if batch.is_vector else SLOW), states.shape[1] << 8)
    landed = follow(batch, states, np.zeros(states.shape[1], np.int64), steps, report)
    found, high = landed.found, np.maximum(landed.found.high, -landed.found.low)
    back = found.period > 0
    kept = back & ((high != 0).any(axis=0) | (landed.states != 0).any(axis=0))
    listed = Listed(landed.states[:, kept], found.period[kept], batch.watched, high[:, kept], found.lost[kept])
    return listed, int((~back).sum()), landed.complete


def one_of_each(listed: Listed) -> Listed:
    """The first of those that are alike in period, amplitudes and overflow."""
    key = np.vstack((listed.periods, listed.overflows, listed.high))
    first = np.sort(np.unique(key, axis=1, return_index=True)[1])
    return chosen(listed, first)


def chosen(listed: Listed, which: NDArray[np.intp] | NDArray[np.bool_]) -> Listed:
    return Listed(listed.states[:, which], listed.periods[which], listed.nodes, listed.high[:, which], listed.overflows[which])


def _register(program: Program, registers: Sequence[int], channel: int, box: Box | None, met: Listed
              ) -> tuple[int, float | None]:
    """The register that can become largest, of those that are bounded, and its bound in steps; else the one that was."""
    steps = np.array([2.0 ** -program.numbers[index].fraction for index in registers])
    if box is None:
        largest = (met.high.max(axis=1, initial=0) * steps).argmax() if len(registers) else 0
        return registers[int(largest)], None
    limits = bounds(program, channel)[0][list(registers)]
    largest = limits.argmax()
    return registers[int(largest)], float(limits[largest] / steps[largest])
