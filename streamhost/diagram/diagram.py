"""A diagram: nodes, coefficient slots, and the coefficients' values beside them."""

import hashlib
from collections.abc import Collection
from dataclasses import dataclass, replace
from functools import cached_property
from importlib import import_module
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from streamhost.diagram.hints import NO_HINTS, Hints
from streamhost.diagram.nodes import Input, Node, Output, Slot

if TYPE_CHECKING:
    from streamhost.diagram.linear import StateSpace, TransferFunction

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class Counts:
    """What a diagram costs per frame and channel: multiplications, additions, and words of memory."""

    multiplications: int
    additions: int
    delays: int


@dataclass(frozen=True, eq=False)
class Diagram:
    """A signal-flow graph. `values` is (slots, channels); new values need no new graph. `hints` are for its drawing only."""

    nodes: tuple[Node, ...]
    slots: tuple[Slot, ...]
    values: FloatArray
    hints: Hints = NO_HINTS

    @cached_property
    def hash(self) -> str:
        """Equal for equal graphs, whatever the coefficients' values."""
        return hashlib.sha256(repr((self.nodes, self.slots)).encode()).hexdigest()

    @cached_property
    def order(self) -> tuple[int, ...]:
        """Evaluation order: of the ready nodes, the one created first."""
        from streamhost.diagram.order import evaluation_order

        return evaluation_order(self)

    @cached_property
    def readers(self) -> tuple[tuple[int, ...], ...]:
        """For each node, the nodes that read it, in order of creation."""
        found: list[list[int]] = [[] for _ in self.nodes]
        for index, node in enumerate(self.nodes):
            for source in dict.fromkeys(node.reads):
                found[source].append(index)
        return tuple(map(tuple, found))

    @property
    def channels(self) -> int:
        return int(self.values.shape[1])

    @cached_property
    def inputs(self) -> tuple[int, ...]:
        return tuple(i for i, node in enumerate(self.nodes) if isinstance(node, Input))

    @cached_property
    def outputs(self) -> tuple[int, ...]:
        return tuple(i for i, node in enumerate(self.nodes) if isinstance(node, Output))

    def with_values(self, values: FloatArray) -> "Diagram":
        """The same graph with other coefficients, shape (slots, channels)."""
        assert values.shape[0] == len(self.slots), "one row of values a slot"
        return replace(self, values=values)

    def counts(self) -> Counts:
        """Multiplications, additions and memory words per frame and channel."""
        return Counts(
            multiplications=sum(node.multiplications for node in self.nodes),
            additions=sum(node.additions for node in self.nodes),
            delays=sum(node.stores for node in self.nodes),
        )

    def has_loop(self) -> bool:
        """Whether some value depends on its own past: whether the diagram is recursive."""
        from streamhost.diagram.questions import has_loop

        return has_loop(self)

    def response_ends(self) -> bool:
        """Whether the impulse response is of finite length, in exact arithmetic on the coefficients as stored."""
        from streamhost.diagram.questions import response_ends

        return response_ends(self)

    def svg(self, *, rounded: Collection[int] = (), values: str = "table") -> str:
        """The block diagram as the text of an SVG file; `rounded`: the nodes that are marked as rounded.

        `values`: those of the coefficients in a "table", "beside" the gains where they find room, or "none".
        DiagramError where the places that the diagram's maker gave leave no room for the wires.
        """
        # By name, since drawings are made of diagrams and not the other way round.
        text: str = import_module("streamhost.drawing").svg(self, rounded=rounded, values=values)
        return text

    def state_space(self, channel: int = 0) -> "StateSpace":
        """A, B, C, D of one channel: x[n+1] = A x[n] + B u[n], y[n] = C x[n] + D u[n]."""
        from streamhost.diagram.linear import state_space

        return state_space(self, channel)

    def transfer_function(self, channel: int = 0) -> "TransferFunction":
        """Numerators and common denominator of one channel, outputs x inputs, in powers of z^-1."""
        from streamhost.diagram.linear import transfer_function

        return transfer_function(self, channel)

    def equation(self, *, nodes: bool = False, digits: int | None = None, channel: int = 0) -> str:
        """The difference equation of one channel, one for each output; or with `nodes` one line for each node.

        Coefficients are written so that they read back to the same float64, or with so many significant `digits`.
        What follows # says whether it is recursive. Of one input and one output, `Filter.from_equation` reads it.
        Raises DiagramError for `digits` other than 1 to 17, and for a coefficient beyond float64.
        """
        from streamhost.diagram.equation import equation, node_equations

        return node_equations(self, digits, channel) if nodes else equation(self, digits, channel)
