"""A whole realization that goes on by itself, in one channel: many states of all its loops side by side."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from streamhost.diagram.nodes import Input, Output
from streamhost.formats import Fixed
from streamhost.measure.cycles.results import Cycle
from streamhost.measure.cycles.search import Landed, follow
from streamhost.measure.levels import peak_dbfs
from streamhost.program.autonomous import Part, driven_by_loops, has_lines, part_of
from streamhost.program.error_bounds import bounds
from streamhost.program.native.batches import Batch
from streamhost.program.native.kernel import Variant, compile_kernel, no_trace
from streamhost.program.program import Program
from streamhost.realization import Realization

Integers = NDArray[np.int64]

CODES = Variant(codes=True, metered=True)
LONGEST_WAVE, SHORTEST_WAVE = 1 << 16, 1 << 8


@dataclass(frozen=True, eq=False)
class Whole:
    """`part` is all of the program, or where that holds long lines only what its loops drive, if that holds none."""

    realization: Realization
    channel: int

    @cached_property
    def part(self) -> Part:
        nodes = tuple(range(len(self.program.nodes)))
        return part_of(self.program, driven_by_loops(self.program) if has_lines(self.program, nodes) else nodes)

    @property
    def program(self) -> Program:
        return self.realization.program

    @property
    def takes_input(self) -> bool:
        return any(isinstance(node, Input) for node in self.part.program.nodes)

    @cached_property
    def outputs(self) -> tuple[int, ...]:
        """The outputs in the part that its loops drive, in order."""
        return tuple(index for index, node in enumerate(self.part.program.nodes) if isinstance(node, Output))

    @cached_property
    def batch(self) -> Batch:
        return Batch(self.part.program, self.outputs, self.channel)

    @cached_property
    def bound(self) -> float:
        """The largest bound of an output without input, in steps of the output's word; infinite where there is none."""
        driven = part_of(self.program, driven_by_loops(self.program)).program
        values = bounds(driven, self.channel)[0]
        found = [values[index] for index, node in enumerate(driven.nodes) if isinstance(node, Output)]
        return float(max(found, default=0.0) * 2.0**self.fraction)

    @property
    def fraction(self) -> int:
        """Fraction bits of the output's word."""
        assert isinstance(self.program.format, Fixed), "a fixed-point program"
        return self.program.format.output.word.fraction

    def embedded(self, part: Part, states: Integers) -> Integers:
        """States of a part as states of the whole, the others 0."""
        place = {word: row for row, word in enumerate(self.part.words)}
        result = np.zeros((len(self.part.words), states.shape[1]), np.int64)
        for row, word in enumerate(part.words):
            result[place[word]] = states[row]
        return result

    def land(self, states: Integers, inputs: Integers | None, steps: int, report: Callable[[float], None]) -> Landed:
        given = np.zeros(states.shape[1], np.int64) if inputs is None else inputs
        return follow(self.batch, states, given, steps, report)

    def output_codes(self, landed: Landed) -> tuple[Integers, Integers]:
        """(high, low) of the outputs in steps of their word, (outputs, lanes)."""
        left = np.array([self.fraction - self.part.program.numbers[index].fraction for index in self.outputs])[:, None]
        return landed.found.high << left, landed.found.low << left

    def peaks(self, landed: Landed) -> Integers:
        """The largest magnitude at each output in steps of its word, (outputs, lanes); 0 where no cycle was found."""
        high, low = self.output_codes(landed)
        return np.where(landed.found.period > 0, np.maximum(high, -low), 0)

    def wave(self, state: Sequence[int], period: int, output: int) -> NDArray[np.float64]:
        """What goes out from a state on without input, one period or more, 1.0 = full scale."""
        periods = -(-SHORTEST_WAVE // period)
        frames, channels = min(period * periods, LONGEST_WAVE), self.program.diagram.channels
        memory = self.realization.memory(channels)
        memory.state[self.part.rows(self.program, 0), self.channel] = state
        outputs = len(self.program.diagram.outputs)
        x, y = np.zeros((frames, channels), np.int64), np.zeros((frames, outputs, channels), np.int64)
        compile_kernel(self.program, CODES).call(memory, x, y, marks=np.zeros(x.shape, np.uint8), trace=no_trace())
        return np.asarray(y[:, self.place(output), self.channel] * 2.0**-self.fraction, dtype=np.float64)

    def place(self, output: int) -> int:
        """Which of the program's outputs that one of the part is."""
        return self.program.diagram.outputs.index(self.part.origins[self.outputs[output]])

    def name(self, output: int) -> str:
        return self.program.nodes[self.part.origins[self.outputs[output]]].label

    def cycle(self, origin: str, landed: Landed, lane: int) -> Cycle | None:
        """The cycle that a lane landed in, as the whole has it; None of silence, or where none was found."""
        period, state = int(landed.found.period[lane]), tuple(map(int, landed.states[:, lane]))
        peaks = self.peaks(landed)[:, lane]
        if period == 0 or not (any(state) or peaks.any()):
            return None
        output = int(peaks.argmax()) if len(peaks) else 0
        lsb = int(peaks[output]) if len(peaks) else 0
        step = 2.0**-self.fraction
        return Cycle(
            origin, period, "dc" if period == 1 else "oscillation", bool(landed.found.lost[lane]),
            "", None, None, self.name(output) if len(peaks) else "", lsb, peak_dbfs(lsb * step), state,
            self.wave(state, period, output) if len(peaks) else np.zeros(0),
        )
