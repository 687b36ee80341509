"""Where the maker of a diagram would draw its nodes. Beside the graph: it says nothing about what is computed.

Places are in columns and rows (to the right and down), multiples of 1/8; a face is the side an arrow leaves by: E, S, W, N.
"""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

from streamhost.diagram.nodes import Node

if TYPE_CHECKING:
    from streamhost.diagram.diagram import Diagram

Point = tuple[float, float]


@dataclass(frozen=True)
class Part:
    """One adder of a sum that is drawn as a chain of adders: it takes the one before it and the next `terms` terms.

    `way`: points that the wire to the next adder runs straight through, as those of a trunk.
    """

    at: Point
    terms: int
    face: str = "E"
    way: tuple[Point, ...] = ()


@dataclass(frozen=True)
class Place:
    """A node's place. `parts`: a sum as a chain, its last adder at `at`. `small`: a rounding as a mark on its wire."""

    at: Point
    face: str = "E"
    parts: tuple[Part, ...] = ()
    small: bool = False


@dataclass(frozen=True)
class Trunk:
    """The wire out of a node runs straight from point to point before it branches: a bus, or the way to the next row."""

    source: int
    points: tuple[Point, ...]


@dataclass(frozen=True)
class General:
    """One section that stands for all of a diagram, and what is written under it.

    `always`: the diagram is too large for a page however it is drawn; else this is drawn only where it turns out so.
    """

    diagram: "Diagram"
    caption: str
    always: bool = True


@dataclass(frozen=True)
class Hints:
    """All that was said about the drawing of a diagram of these nodes; a diagram of others is drawn without."""

    nodes: tuple[Node, ...] = ()
    places: Mapping[int, Place] | None = None
    trunks: tuple[Trunk, ...] = ()
    general: General | None = None

    def places_for(self, nodes: tuple[Node, ...]) -> Mapping[int, Place] | None:
        """The places, if they are those of all these nodes."""
        if self.places is None or self.nodes != nodes or len(self.places) < len(nodes):
            return None
        return self.places


NO_HINTS = Hints()
