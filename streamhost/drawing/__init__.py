"""A diagram as a drawing: SVG in the manner of a textbook."""

from collections.abc import Collection

from streamhost.diagram import Diagram
from streamhost.drawing.layout import Layout, laid_out
from streamhost.drawing.plain import LEGEND, plain_of
from streamhost.drawing.ports import NoWayError
from streamhost.drawing.sheet import Sheet, sheet_of
from streamhost.drawing.svg import svg_of
from streamhost.drawing.table import value_table
from streamhost.errors import DiagramError

__all__ = ["plain", "svg"]

LOOSER = (1.0, 1.5, 2.25, 3.5)
"""How much wider the gaps become each time that the wires found no room."""


def svg(diagram: Diagram, *, rounded: Collection[int] = (), values: bool = True) -> str:
    """The block diagram as the text of an SVG file, black on white, at most 180 mm wide and 255 mm high.

    `rounded`: the nodes whose value is rounded, which get an open square with Q. `values`: the table of coefficients.
    A diagram too large for a page is drawn as one section that stands for all, with the values of all.
    DiagramError where the places that its maker gave leave no room for the wires.
    """
    general = diagram.hints.general
    drawn = general.diagram if general is not None else diagram
    table = value_table(diagram) if values else None
    return svg_of(layout_of(drawn, rounded), table, "Block diagram", general.caption if general is not None else "")


def plain(diagram: Diagram, *, rounded: Collection[int] = ()) -> str:
    """The block diagram in ASCII, for a terminal or a comment in source code; options and errors are those of `svg`."""
    general = diagram.hints.general
    drawing = plain_of(layout_of(general.diagram if general is not None else diagram, rounded))
    return "\n\n".join([drawing, *([general.caption] if general is not None else []), LEGEND])


def layout_of(diagram: Diagram, rounded: Collection[int] = ()) -> Layout:
    """The drawing before it is written down."""
    sheet = sheet_of(diagram, rounded)
    if diagram.hints.places_for(diagram.nodes) is None:
        return without_places(sheet)
    try:
        return laid_out(sheet)
    except NoWayError as error:
        raise DiagramError(f"The places of this diagram's nodes leave {error}. Put them further apart.") from None


def without_places(sheet: Sheet) -> Layout:
    """A sheet that is placed here, looser until its wires find room."""
    from streamhost.drawing.placer import placed

    for looseness in LOOSER[:-1]:
        try:
            return laid_out(placed(sheet, looseness))
        except NoWayError:
            continue
    return laid_out(placed(sheet, LOOSER[-1]))
