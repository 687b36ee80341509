"""Printing a walk through a box of states: every state is followed until it leaves the box or meets what was walked before.

Points are u = T x with |u| at most `limits`, numbered with the first coordinate slowest; x, the states in codes, are T^-1 u.
Marks: 0 not walked, 1 on the path that is walked now, 2 done. A state whose path leaves the box is on no cycle inside it,
and neither is one whose path meets a state that is done, unless that cycle was found then: from the first state of a
cycle that a path meets it can only go round, on states without marks, until it meets a 1, its own first state. So each
cycle that lies in the box as a whole is found once, and nothing else is. Each state is stepped twice.
"""

from collections.abc import Sequence

from streamhost.program.native.batch import StepPrinter
from streamhost.program.native.frame import close_text
from streamhost.program.program import Program


def print_walk(program: Program) -> str:
    """The source of the walk: from the points `frames` .. `channels` - 1; meters_ holds a count, then a point of each cycle.

    No more than `frame0` of them are written down.
    """
    return WalkPrinter(program).source()


class WalkPrinter(StepPrinter):
    """States are s{node}, coordinates u0, u1, ..., the point `at`, -1 where it is outside."""

    def __init__(self, program: Program) -> None:
        super().__init__(program, watching=False, vector=False)
        self.size = len(self.states)

    def source(self) -> str:
        """Arrays: x_ is T, y_ its inverse, keys_ the limits, trace_ the words, state_ the coordinates of the first point."""
        self.head()
        text, size = self.text, self.size
        text(f"T = carray(x_, ({size}, {size}), np.int64)")
        text(f"V = carray(y_, ({size}, {size}), np.int64)")
        text(f"D = carray(state_, ({size},), np.int64)")
        text(f"C = carray(coefficients_, ({max(1, len(self.program.diagram.slots))}, 1), np.int64)")
        text(f"L = carray(keys_, ({size},), np.int64)")
        text("G = carray(meters_, (frame0 + 1,), np.int64)")
        text("M = carray(marks_, (channels,), np.uint8)")
        text(f"W = carray(trace_, ({size}, 2), np.int64)")
        for name, rows in (("t", "T"), ("w", "V")):
            for i in range(size):
                for j in range(size):
                    text(f"{name}{i}_{j} = {rows}[{i}, {j}]")
        for i in range(size):
            text(f"l{i} = L[{i}]")
            text(f"d{i} = D[{i}]")
        self.load_coefficients("0")
        text("for start in range(frames, channels):")
        with text.indented():
            text("if np.int64(M[start]) == 0:")
            with text.indented():
                self.decode()
                text(f"M[start] = 2 * ({self.outside()})")
                text("at = start")
                self.print_path(0, 1)
                text("if (at >= 0) & (np.int64(M[max(at, 0)]) == 1) & (G[0] < frame0):")
                with text.indented():
                    text("G[0] += 1")
                    text("G[G[0]] = at")
                self.decode()
                text("at = start")
                self.print_path(1, 2)
            self.next_point()
        text.depth = 0
        close_text(text)
        return str(text)

    def print_path(self, found: int, left: int) -> None:
        """From `at` on, as long as points have the one mark, which becomes the other."""
        self.text(f"while (at >= 0) & (np.int64(M[max(at, 0)]) == {found}):")
        with self.text.indented():
            self.text(f"M[at] = {left}")
            self.step()
            self.encode()

    def decode(self) -> None:
        """The states of the point `start`."""
        for i, index in enumerate(self.states):
            self.text(f"s{index} = {combined([f'w{i}_{j} * d{j}' for j in range(self.size)])}")

    def next_point(self) -> None:
        """The coordinates of the point behind `start`."""
        last = self.size - 1
        self.text(f"d{last} = d{last} + 1")
        for i in range(last, 0, -1):
            self.text(f"if d{i} > l{i}:")
            with self.text.indented():
                self.text(f"d{i} = -l{i}")
                self.text(f"d{i - 1} = d{i - 1} + 1")

    def outside(self) -> str:
        """1 where a state does not fit its word: a point of the box that is none, which is done with."""
        tests = [f"np.int64(s{index} < W[{i}, 0]) | np.int64(s{index} > W[{i}, 1])" for i, index in enumerate(self.states)]
        return " | ".join(tests)

    def encode(self) -> None:
        """The point `at` of the states; -1 outside the box."""
        for i in range(self.size):
            self.text(f"e{i} = {combined([f't{i}_{j} * s{index}' for j, index in enumerate(self.states)])}")
        place = "(e0 + l0)"
        for i in range(1, self.size):
            place = f"({place} * (2 * l{i} + 1) + (e{i} + l{i}))"
        inside = " & ".join(f"(e{i} >= -l{i}) & (e{i} <= l{i})" for i in range(self.size))
        self.text(f"at = {place} if {inside} else -1")


def combined(terms: Sequence[str]) -> str:
    return " + ".join(terms)
