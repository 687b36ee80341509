"""A drawing and what stands below it: details of tapped lines, captions, the table of values."""

from collections.abc import Collection
from dataclasses import dataclass

from streamhost.diagram import Diagram, Gain, Taps
from streamhost.diagram.equation import equation
from streamhost.diagram.questions import response_frames
from streamhost.diagram.tapped import written_out
from streamhost.drawing import text
from streamhost.drawing.layout import Layout, laid_out
from streamhost.drawing.ports import NoWayError
from streamhost.drawing.sheet import Sheet, has_upright_marks, sheet_of, taps_text
from streamhost.drawing.symbols import GRID
from streamhost.drawing.table import Table, value_table
from streamhost.errors import DiagramError

VALUES = ("table", "beside", "none")

LOOSER = (1.0, 1.5, 2.25, 3.5)
"""How much wider the gaps become each time that the wires found no room."""

IN_LINE = (0.5, 0.0)
"""How much straighter the way from input to output is tried, the tidiest taken, of diagrams of up to FEW symbols."""

FEW = 20

WIDER = (1.0, 1.25)
"""How much further apart columns may stand to make room for values."""

MM = 25.4 / 96
PAGE, PAGE_HEIGHT = 180.0, 255.0
"""Width and height of a page's text in mm: a larger drawing is scaled down to them."""

LEAST_SCALE = 0.8
TABLE_ROW = 16.0
AROUND = 128.0
"""What a drawing takes above and below its symbols, with captions and the head of a table, in px."""

ROOM_FOR_MARKS = ((1.0, 1.0), (1.25, 1.0), (1.0, 1.25), (1.25, 1.25), (1.5, 1.5), (2.0, 2.0))
"""The same of columns and rows for marks."""

TALLER = (1.2, 1.4)
"""How much taller the rows become before that where symbols that face up or down carry a mark and find no room."""

DIGITS = 6
MOST_DELAYS = 8
"""Words of memory beyond which an equation cannot fit on a line."""

MOST_STATES = 256
"""The same beyond which it takes too long to find out whether the response of a recursive diagram ends."""


@dataclass(frozen=True)
class Detail:
    """What a symbol of the drawing stands for."""

    title: text.Label
    layout: Layout


@dataclass(frozen=True)
class Figure:
    """All that is drawn and written, from top to bottom. `equation`: where there is one short enough for a line."""

    title: str
    layout: Layout
    details: tuple[Detail, ...]
    notes: tuple[str, ...]
    equation: str
    nature: str
    table: Table | None


def figure_of(diagram: Diagram, rounded: Collection[int], values: str, loop_mark: str) -> Figure:
    """The figure of a diagram; `loop_mark` is what wires in loops look like. Errors as of `svg`."""
    if values not in VALUES:
        raise DiagramError(f'values = "{values}" is not known: {", ".join(VALUES)}.')
    general = diagram.hints.general
    drawn, marked, notes = line_alone(diagram, rounded) if is_lone_line(diagram) else (diagram, rounded, [])
    table = None if values == "none" else value_table(diagram)
    if general is None or not general.always:
        layout = beside_or_not(drawn, marked, values == "beside" and are_alike(diagram))
    if general is not None and (general.always or is_too_high(layout, table)):
        drawn, notes = general.diagram, [general.caption]
        layout = layout_of(drawn, marked_in(general.diagram, diagram, rounded))
    details, more = details_of(drawn)
    if any(symbol.value for symbol in layout.sheet.symbols) and not details:
        table = None
    return Figure("Block diagram", layout, details, (*notes, *more), "" if values == "none" else short_equation(diagram),
                  nature(diagram, loop_mark if layout.sheet.looped else ""), table)


def is_too_high(layout: Layout, table: Table | None) -> bool:
    """Whether a drawing with its table would be scaled down by more than LEAST_SCALE to fit a page."""
    rows = [symbol.at[1] for symbol in layout.sheet.symbols]
    high = (max(rows) - min(rows)) * GRID + (TABLE_ROW * len(table.rows) if table is not None else 0.0) + AROUND
    return high > PAGE_HEIGHT / MM / LEAST_SCALE


def marked_in(general: Diagram, diagram: Diagram, rounded: Collection[int]) -> set[int]:
    """The nodes of a section that stands for others whose like is rounded in those."""
    labels = {diagram.nodes[index].label for index in rounded}
    labels |= {label.partition("_")[0] + "_i" for label in labels}
    found = {index for index, node in enumerate(general.nodes) if node.label in labels and node.kind != "output"}
    if any(isinstance(diagram.nodes[index], Taps) for index in rounded):
        found.update(source for output in general.outputs for source in general.nodes[output].reads)
    return found


def is_lone_line(diagram: Diagram) -> bool:
    """Whether a diagram is a tapped line and nothing else."""
    return sorted(node.kind for node in diagram.nodes) == ["input", "output", "taps"]


def line_alone(diagram: Diagram, rounded: Collection[int]) -> tuple[Diagram, Collection[int], list[str]]:
    """A tapped line written out, which of its nodes are rounded, and what must be said about it."""
    (index,) = (index for index, node in enumerate(diagram.nodes) if isinstance(node, Taps))
    line, caption = written_out(diagram, index, *(diagram.nodes[i].label for i in (*diagram.inputs, *diagram.outputs)))
    before = {index: line.nodes[line.outputs[0]].reads[0], diagram.inputs[0]: line.inputs[0]}
    return line, {before[node] for node in rounded if node in before}, [caption] if caption else []


def details_of(diagram: Diagram) -> tuple[tuple[Detail, ...], list[str]]:
    """The tapped lines of a diagram written out, and what must be said about them."""
    details: list[Detail] = []
    notes: list[str] = []
    for index, node in enumerate(diagram.nodes):
        if isinstance(node, Taps):
            x, y = diagram.nodes[node.source].label, node.label
            line, caption = written_out(diagram, index, x, y)
            title = (*taps_text(diagram, node), text.Run(" from "), *text.signal(x), text.Run(" to "), *text.signal(y))
            details.append(Detail(title, layout_of(line)))
            notes += [caption] if caption else []
    return tuple(details), notes


def are_alike(diagram: Diagram) -> bool:
    """Whether all channels have the same coefficients."""
    return bool((diagram.values == diagram.values[:, :1]).all())


def beside_or_not(diagram: Diagram, rounded: Collection[int], values: bool) -> Layout:
    """The drawing with values beside the gains if that is wanted and all find room, else without."""
    for wider in WIDER if values else ():
        layout = layout_of(diagram, rounded, values=True, wider=wider)
        shown = sum(symbol.value != () for symbol in layout.sheet.symbols)
        if layout.is_clear and shown == sum(isinstance(node, Gain) for node in diagram.nodes):
            return layout
    return layout_of(diagram, rounded)


def layout_of(diagram: Diagram, rounded: Collection[int] = (), *, values: bool = False, wider: float = 1.0) -> Layout:
    """A drawing before it is written down; where marks find no room, columns or rows are moved apart."""
    if diagram.hints.places_for(diagram.nodes) is None:
        return without_places(sheet_of(diagram, rounded, values=values))
    for across, down in room_for_marks(diagram, rounded):
        try:
            return laid_out(sheet_of(diagram, rounded, values=values, apart=(wider * across, down)))
        except NoWayError as error:
            refused = error
    raise DiagramError(f"The places of this diagram's nodes leave {refused}. Put them further apart.")


def room_for_marks(diagram: Diagram, rounded: Collection[int]) -> list[tuple[float, float]]:
    """How far apart columns and rows are tried, the first first."""
    if not has_upright_marks(diagram, rounded):
        return list(ROOM_FOR_MARKS if rounded else ROOM_FOR_MARKS[:1])
    taller = [(1.0, down) for down in TALLER]
    return [ROOM_FOR_MARKS[0], *taller, *((across, TALLER[-1] * down) for across, down in ROOM_FOR_MARKS[1:])]


def without_places(sheet: Sheet) -> Layout:
    """A sheet that is placed here, looser until its wires find room."""
    from streamhost.drawing.placer import placed

    for looseness in LOOSER:
        found = []
        for in_line in IN_LINE if len(sheet.symbols) <= FEW else IN_LINE[:1]:
            try:
                found.append(laid_out(placed(sheet, looseness, in_line)))
            except NoWayError as error:
                refused = error
        if found:
            return min(found, key=lambda layout: layout.disorder)
    raise refused


def short_equation(diagram: Diagram) -> str:
    """The difference equation with few digits on one line; "" where it is long, or one channel's would not do."""
    if len(diagram.inputs) != 1 or len(diagram.outputs) != 1 or not are_alike(diagram):
        return ""
    if diagram.counts().delays > MOST_DELAYS:
        return ""
    return equation(diagram, DIGITS, width=None, marked=False)


def nature(diagram: Diagram, loop_mark: str = "") -> str:
    """Whether a diagram is recursive and whether its impulse response ends, in a sentence.

    Of a recursive diagram of more than MOST_STATES words the second is left out.
    """
    recursive = diagram.has_loop()
    head = "Not recursive" if not recursive else f"Recursive along {loop_mark}" if loop_mark else "Recursive"
    if recursive and diagram.counts().delays > MOST_STATES:
        return f"{head}."
    frames = response_frames(diagram)
    if frames is None:
        return f"{head}; the impulse response does not end."
    link = ", and yet" if recursive else ";"
    return f"{head}{link} the impulse response ends after {frames} frame{'' if frames == 1 else 's'}."
