"""Writing a signal-flow graph down: plain calls, no operators.

b = Builder()
x = b.input()
d = b.delay("d1")
y = b.sum(x, b.gain(d, "k", 0.9), label="y")
d.takes(y)
b.output(y)
diagram = b.build()
"""

import re
import sys
from collections.abc import Sequence
from dataclasses import dataclass, replace
from types import FrameType

import numpy as np
from numpy.typing import ArrayLike

from streamhost.diagram.diagram import Diagram
from streamhost.diagram.hints import General, Hints, Part, Place, Point, Trunk
from streamhost.diagram.nodes import Delay, Gain, Input, Node, Output, Residue, Round, Shift, Slot, Sum, Taps, Term
from streamhost.errors import DiagramError

UNDRIVEN = -1
FACES = ("E", "S", "W", "N")


@dataclass(frozen=True)
class Ref:
    """A node under construction."""

    builder: "Builder"
    index: int

    def takes(self, source: "Ref") -> None:
        """Drive a delay that was made first: this is how a loop is written."""
        self.builder.drive(self, source)


@dataclass(frozen=True)
class Signed:
    """A term of a sum that is subtracted."""

    ref: Ref


def minus(ref: Ref) -> Signed:
    """The term of a sum that is subtracted; there is no node that negates."""
    return Signed(ref)


class Builder:
    """Collects nodes in the order in which they are created, which decides the evaluation order among ready ones.

    With a Python `file`, what is wrong with the diagram is told with the line of that file that made the node.
    """

    def __init__(self, file: str = "") -> None:
        self._file = file
        self._lines: dict[str, int] = {}
        self._nodes: list[Node] = []
        self._slots: list[Slot] = []
        self._values: list[np.ndarray[tuple[int], np.dtype[np.float64]]] = []
        self._labels: set[str] = set()
        self._numbers: dict[str, int] = {}
        self._places: dict[int, Place] = {}
        self._trunks: list[Trunk] = []

    def input(self, label: str = "x") -> Ref:
        return self._add(Input(self._label(label, "x")))

    def output(self, source: Ref, name: str = "y") -> Ref:
        """An output. Raises DiagramError where two outputs share a name."""
        if any(isinstance(node, Output) and node.label == name for node in self._nodes):
            raise DiagramError(f'Two outputs are named "{name}". Each output has a name of its own.')
        return self._add(Output(name, self._own(source)))

    def delay(self, label: str = "", source: Ref | None = None, n: int = 1) -> Ref:
        """z^-n, to be driven now or later by `takes`."""
        return self._add(Delay(self._label(label, "d"), UNDRIVEN if source is None else self._own(source), n))

    def drive(self, delay: Ref, source: Ref) -> None:
        node = self._nodes[self._own(delay)]
        if not isinstance(node, Delay):
            raise DiagramError(f'"{node.label}" is a {node.kind}, and only a delay is driven later.')
        if node.source != UNDRIVEN:
            raise DiagramError(f'The delay "{node.label}" is driven twice.')
        self._nodes[delay.index] = replace(node, source=self._own(source))

    def gain(
        self,
        source: Ref,
        label: str,
        value: ArrayLike = 1.0,
        *,
        section: int | None = None,
        part: str = "",
        feedback: bool = False,
    ) -> Ref:
        """A multiplication by `value`: a number, or one per channel."""
        slot = self._slot(Slot(label, section, part, feedback), value)
        return self._add(Gain(self._label(label, "g"), self._own(source), slot))

    def again(self, gain: Ref, source: Ref, label: str = "") -> Ref:
        """Another multiplication by the coefficient of a gain, which is stored once."""
        node = self._nodes[self._own(gain)]
        if not isinstance(node, Gain):
            raise DiagramError(f'"{node.label}" is a {node.kind}, and only a gain has a coefficient to multiply by again.')
        return self._add(Gain(self._label(label, node.label), self._own(source), node.coefficient))

    def shift(self, source: Ref, k: int, label: str = "") -> Ref:
        """2^k of the structure."""
        return self._add(Shift(self._label(label, "shift"), self._own(source), k))

    def sum(self, *terms: Ref | Signed, label: str = "", grow: int | None = None, overflow: str = "wrap") -> Ref:
        """Signed terms in the drawn order. `grow` marks a longer register that wraps; saturation there is refused."""
        if grow is not None and overflow != "wrap":
            raise DiagramError(
                f'The sum "{label}" is marked grow = {grow} with overflow = "{overflow}": a longer register '
                f"of a running sum is exact only where it wraps. Saturation there is refused."
            )
        signed = tuple(Term(-1, self._own(t.ref)) if isinstance(t, Signed) else Term(1, self._own(t)) for t in terms)
        return self._add(Sum(self._label(label, "sum"), signed, grow))

    def taps(
        self,
        source: Ref,
        label: str,
        values: Sequence[ArrayLike],
        *,
        fold: str | None = None,
        last_first: bool = False,
        section: int | None = None,
        part: str = "b",
    ) -> Ref:
        """A tapped delay line with its weighted sum, tap 0 added first, or last.

        `values`: one coefficient a tap; folded ("even" or "odd"), all taps are given and must have that symmetry.
        """
        values = list(values)
        if fold is not None and last_first:
            raise DiagramError(
                f'The taps "{label}" are folded: pairs are added from both ends inwards, never last first.'
            )
        kept = list(enumerate(values if fold is None else folded_half(values, fold, label)))
        ordered = reversed(kept) if last_first else kept
        slots = tuple(self._slot(Slot(f"{label}{i}", section, part), value) for i, value in ordered)
        return self._add(Taps(self._label(label, "taps"), self._own(source), slots, len(values), fold, last_first))

    def round(self, source: Ref, label: str = "") -> Ref:
        """A register where the rules give none."""
        return self._add(Round(self._label(label, "round"), self._own(source)))

    def residue(self, register: Ref, label: str = "") -> Ref:
        """What the rounding of a register dropped in this frame."""
        return self._add(Residue(self._label(label, "residue"), self._own(register)))

    def place(self, ref: Ref, at: Point, face: str = "E", *, parts: Sequence[Part] = (), small: bool = False) -> Ref:
        """Where a node is drawn, see `diagram/hints.py`; the drawing places all nodes itself unless all are placed."""
        if face not in FACES:
            raise DiagramError(f"The face {face!r} is not known: an arrow leaves by one of the sides {', '.join(FACES)}.")
        if any(coordinate * 8 != round(coordinate * 8) for coordinate in at):
            raise DiagramError(f"The place {at} is not on the grid: columns and rows are multiples of 1/8.")
        self._places[self._own(ref)] = Place(at, face, tuple(parts), small)
        return ref

    def place_of(self, ref: Ref) -> Place | None:
        """Where a node is drawn, if that was said."""
        return self._places.get(self._own(ref))

    def trunk(self, source: Ref, *points: Point) -> None:
        """The wire out of a node runs straight from point to point before it branches."""
        self._trunks.append(Trunk(self._own(source), points))

    def trunk_end(self, source: Ref) -> Point:
        """The last point of the wire out of a node that was said."""
        points = [point for trunk in self._trunks if trunk.source == self._own(source) for point in trunk.points]
        assert points, "a wire whose way was said"
        return points[-1]

    def build(self, *, check: bool = True, general: General | None = None) -> Diagram:
        """The diagram; `general` stands for it in drawings. DiagramError where a rule of signal-flow graphs is broken."""
        from streamhost.diagram.legality import check_diagram

        nodes = tuple(self._nodes)
        hints = Hints(nodes, dict(self._places), tuple(self._trunks), general)
        diagram = Diagram(nodes, tuple(self._slots), self._table(), hints)
        if check:
            try:
                check_diagram(diagram)
            except DiagramError as error:
                raise DiagramError(self._located(str(error))) from None
        return diagram

    def _located(self, message: str) -> str:
        """A refusal behind the line that made the first of the nodes it names."""
        labels = [quoted or before for quoted, before in re.findall(r'"([^"]+)"|(\S+) ->', message)]
        made_at = [self._lines[label] for label in labels if label in self._lines]
        return f"{self._file}, line {made_at[0]}: {message}" if made_at else message

    def _add(self, node: Node) -> Ref:
        self._nodes.append(node)
        if self._file:
            frame: FrameType | None = sys._getframe(1)
            while frame is not None and frame.f_code.co_filename != self._file:
                frame = frame.f_back
            if frame is not None:
                self._lines[node.label] = frame.f_lineno
        return Ref(self, len(self._nodes) - 1)

    def _table(self) -> np.ndarray[tuple[int, int], np.dtype[np.float64]]:
        """The coefficients, (slots, channels)."""
        channels = max((len(v) for v in self._values), default=1)
        for slot, values in zip(self._slots, self._values, strict=True):
            if len(values) not in (1, channels):
                raise DiagramError(
                    f'The coefficient "{slot.label}" has {len(values)} values, and others have {channels}: '
                    f"give one, or one per channel."
                )
        table = np.empty((len(self._slots), channels))
        for row, values in zip(table, self._values, strict=True):
            row[:] = values
        return table

    def _own(self, ref: Ref) -> int:
        if ref.builder is not self:
            raise DiagramError("A node of another diagram was used here. Nodes belong to the builder that made them.")
        return ref.index

    def _label(self, wanted: str, stem: str) -> str:
        stem = wanted or stem
        label, count = stem, self._numbers.get(stem, 1)
        while label in self._labels:
            count += 1
            label = f"{stem}_{count}"
        self._labels.add(label)
        self._numbers[stem] = count
        return label

    def _slot(self, slot: Slot, value: ArrayLike) -> int:
        values = np.atleast_1d(np.asarray(value, dtype=np.float64))
        if values.ndim != 1 or not np.isfinite(values).all():
            raise DiagramError(
                f'The coefficient "{slot.label}" = {value!r} is not a finite number, or one per channel.'
            )
        self._slots.append(slot)
        self._values.append(values)
        return len(self._slots) - 1


def folded_half(values: Sequence[ArrayLike], fold: str, label: str) -> list[ArrayLike]:
    """The taps from one end to the middle, after a check of the symmetry that `fold` states."""
    if fold not in ("even", "odd"):
        raise DiagramError(f'fold = {fold!r} of the taps "{label}" is not known: "even" or "odd" symmetry.')
    sign = 1 if fold == "even" else -1
    length = len(values)
    for i in range(length // 2):
        if not np.array_equal(np.asarray(values[i]), sign * np.asarray(values[length - 1 - i])):
            raise DiagramError(
                f'The taps "{label}" have no {fold} symmetry: tap {i} is {values[i]!r}, '
                f"tap {length - 1 - i} is {values[length - 1 - i]!r}."
            )
    if fold == "odd" and length % 2:
        if np.any(np.asarray(values[length // 2]) != 0):
            raise DiagramError(
                f'The taps "{label}" have odd symmetry and a middle tap of {values[length // 2]!r}: it must be 0.'
            )
        return list(values[: length // 2])
    return list(values[: (length + 1) // 2])
