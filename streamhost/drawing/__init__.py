"""A diagram as a drawing: SVG in the manner of a textbook, and plain text."""

from collections.abc import Collection

from streamhost.diagram import Diagram
from streamhost.drawing.figure import figure_of, layout_of, nature
from streamhost.drawing.plain import plain_text
from streamhost.drawing.svg import svg_of

__all__ = ["layout_of", "nature", "plain", "svg"]


def svg(diagram: Diagram, *, rounded: Collection[int] = (), values: str = "table") -> str:
    """The block diagram as the text of an SVG file, black on white, at most 180 mm wide and 255 mm high.

    `rounded`: the nodes whose value is rounded, which get an open square with Q. `values`: those of the coefficients
    in a "table" below, "beside" the gains, which becomes a table where they find no room, or "none".
    A diagram too large for a page is drawn as one section that stands for all, with the values of all; a tapped line
    that is not alone as a box, and written out below. Wires that are part of a loop are heavier.
    DiagramError where the places that its maker gave leave no room for the wires, and for other `values`.
    """
    return svg_of(figure_of(diagram, rounded, values, "the heavy lines"))


def plain(diagram: Diagram, *, rounded: Collection[int] = (), values: str = "table") -> str:
    """The block diagram in ASCII, for a terminal or a comment in source code; options and errors are those of `svg`.

    Values are in a table, or none.
    """
    return plain_text(figure_of(diagram, rounded, "none" if values == "none" else "table", "the = wires"))
