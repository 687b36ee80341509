"""A figure as SVG text: groups of wires, dots, heads, symbols, signs and names; captions and the table under them.

Text stays text. The stroke widths and fonts are attributes of groups, so that several drawings in one page do not meet.
"""

from collections.abc import Iterator, Sequence
from xml.sax.saxutils import escape, quoteattr

from streamhost.drawing import text
from streamhost.drawing.figure import MM, PAGE, PAGE_HEIGHT, TABLE_ROW, Figure
from streamhost.drawing.labels import VALUE_SIZE, Shape, body, mark_shape, minus_shape
from streamhost.drawing.layout import Layout
from streamhost.drawing.strokes import Head, Line, dots_of, heads_of, lines_of
from streamhost.drawing.symbols import DOT, GRID, HEAD, RADIUS, STEP, TERMINAL, TRIANGLE, Symbol
from streamhost.drawing.table import Table

FONT = "'STIX Two Text','Latin Modern Roman','Times New Roman','DejaVu Serif',serif"
SANS = "'Helvetica','Arial','DejaVu Sans',sans-serif"
BORDER = 8.0
PLUS = 5.0
TABLE_SIZE, TABLE_GAP, TABLE_OFF = 11.0, 18.0, 26.0
CAPTION_SIZE, CAPTION_ROW, CAPTION_OFF, DETAIL_OFF, DRAWING_OFF = 11.0, 17.0, 24.0, 40.0, 18.0
VALUE_INK = "#444"
LIGHT, HEAVY = 1.2, 2.2
"""Widths of wires; heavy ones are part of a loop."""

Q_SIZE = 9.0
DROP, RISE = 0.26, 0.38
"""How far subscripts and superscripts are off the base line, in units of the size."""


def svg_of(figure: Figure) -> str:
    """The figure as the text of an SVG file: its parts one below another, centred under the drawing."""
    box = bounds(figure.layout)
    pieces = list(drawing(figure.layout))
    for detail in figure.details:
        more, box = caption_below(box, detail.title, DETAIL_OFF)
        pieces += more
        more, box = drawing_below(box, detail.layout)
        pieces += more
    for number, words in enumerate(captions_of(figure, box)):
        more, box = caption_below(box, words, CAPTION_ROW if number else CAPTION_OFF)
        pieces += more
    if figure.table is not None:
        more, box = table_below(box, figure.table)
        pieces += more
    return framed(box.grown(BORDER), pieces, figure.title)


def captions_of(figure: Figure, box: Shape) -> Iterator[text.Label]:
    """The lines below the drawing; the equation if it fits a page, or is no wider than the drawing."""
    yield from map(text.sentence, figure.notes)
    if figure.equation:
        words = text.equation(figure.equation)
        if text.width(words, CAPTION_SIZE) <= max(box.right - box.left, PAGE / MM - 2 * BORDER):
            yield words
    yield text.sentence(figure.nature)


def caption_below(box: Shape, words: text.Label, off: float) -> tuple[list[str], Shape]:
    """A line of text below all there is, and the box that holds that too."""
    middle, base, wide = (box.left + box.right) / 2, box.bottom + off, text.width(words, CAPTION_SIZE)
    written = label(words, middle, base, "middle", CAPTION_SIZE)
    shape = Shape(min(box.left, middle - wide / 2), box.top, max(box.right, middle + wide / 2), base + CAPTION_SIZE * DROP)
    return [f'<g data-part="caption" font-size="{num(CAPTION_SIZE)}">', written, "</g>"], shape


def drawing_below(box: Shape, layout: Layout) -> tuple[list[str], Shape]:
    """The same of a drawing that explains a symbol."""
    own = bounds(layout)
    across = round((box.left + box.right - own.left - own.right) / 2)
    down = round(box.bottom + DRAWING_OFF - own.top)
    pieces = [f'<g data-part="detail" transform="translate({across} {down})">', *drawing(layout), "</g>"]
    return pieces, Shape(min(box.left, own.left + across), box.top, max(box.right, own.right + across), own.bottom + down)


def table_below(box: Shape, table: Table) -> tuple[list[str], Shape]:
    widths = column_widths(table)
    wide = sum(widths) + TABLE_GAP * (len(widths) - 1)
    left, top = (box.left + box.right - wide) / 2, box.bottom + TABLE_OFF
    shape = Shape(min(box.left, left), box.top, max(box.right, left + wide), top + TABLE_ROW * (len(table.rows) + 0.5))
    return list(table_pieces(table, widths, left, top)), shape


def framed(box: Shape, pieces: Sequence[str], title: str) -> str:
    wide, high = box.right - box.left, box.bottom - box.top
    scale = min(MM, PAGE / wide, PAGE_HEIGHT / high)
    place = " ".join(map(num, (box.left, box.top, wide, high)))
    size = f'width="{num(wide * scale)}mm" height="{num(high * scale)}mm"'
    return "\n".join([
        f'<svg xmlns="http://www.w3.org/2000/svg" {size} viewBox="{place}"',
        f'role="img" aria-label={quoteattr(title)} font-family="{FONT}" fill="#000">',
        f"<title>{escape(title)}</title>",
        f'<rect x="{num(box.left)}" y="{num(box.top)}" width="{num(wide)}" height="{num(high)}" fill="#fff"/>',
        *pieces, "</svg>", "",
    ])


def drawing(layout: Layout) -> Iterator[str]:
    symbols = layout.sheet.symbols
    strokes = [lines_of(layout, source) for source in layout.nets]
    yield from wires("wires", LIGHT, [net.once for net in strokes])
    yield from wires("loops", HEAVY, [net.looped for net in strokes])
    yield '<g data-part="dots">'
    for source in layout.nets:
        yield from (f'<circle cx="{num(x)}" cy="{num(y)}" r="{DOT}"/>' for x, y in dots_of(layout, source))
    yield '</g>\n<g data-part="heads">'
    yield from map(head, heads_of(layout))
    yield '</g>\n<g data-part="symbols" fill="#fff" stroke="#000" stroke-width="1.4">'
    yield from map(outline, symbols)
    yield from (rectangle(mark_shape(symbol), f' data-mark="{symbol.id}"') for symbol in symbols if symbol.marked)
    yield '</g>\n<g data-part="signs" fill="none" stroke="#000" stroke-width="1.3">'
    yield from (plus(symbol) for symbol in symbols if symbol.kind in ("sum", "pill"))
    yield "</g>"
    yield '<g data-part="minus" fill="none" stroke="#000" stroke-width="1.3">'
    for wire, end in zip(layout.sheet.wires, layout.sinks, strict=True):
        if wire.sign < 0:
            dash = minus_shape(symbols[wire.sink], end)
            yield f'<path d="M{num(dash.left)} {num(dash.top)}H{num(dash.right)}"/>'
    yield f'</g>\n<g data-part="names" font-size="{num(text.SIZE)}">'
    yield from names(layout)
    yield "</g>"


def wires(part: str, width: float, nets: Sequence[Sequence[Line]]) -> Iterator[str]:
    yield f'<g data-part="{part}" fill="none" stroke="#000" stroke-width="{width}" stroke-linecap="square">'
    yield from (path(lines) for lines in nets if lines)
    yield "</g>"


def path(lines: Sequence[Line]) -> str:
    pieces = (f"M{num(line.x0)} {num(line.y0)}" + (f"H{num(line.x1)}" if line.is_level else f"V{num(line.y1)}")
              for line in lines)
    return f'<path d="{"".join(pieces)}"/>'


def head(arrow: Head) -> str:
    (x, y), (dx, dy) = arrow.tip, STEP[arrow.direction]
    length, half = HEAD[0], HEAD[1] / 2
    base_x, base_y = x - dx * length, y - dy * length
    corners = ((x, y), (base_x - dy * half, base_y + dx * half), (base_x + dy * half, base_y - dx * half))
    return f'<path d="M{"L".join(f"{num(cx)} {num(cy)}" for cx, cy in corners)}Z"/>'


def outline(symbol: Symbol) -> str:
    x, y = symbol.at[0] * GRID, symbol.at[1] * GRID
    data = f' data-symbol="{symbol.id}" data-kind="{symbol.kind}"'
    if symbol.kind in ("input", "output", "sum"):
        radius = RADIUS if symbol.kind == "sum" else TERMINAL
        return f'<circle cx="{num(x)}" cy="{num(y)}" r="{num(radius)}"{data}/>'
    if symbol.kind == "gain":
        dx, dy = STEP[symbol.face]
        corners = ((dx, dy), (-dx - dy, -dy + dx), (-dx + dy, -dy - dx))
        points = "L".join(f"{num(x + cx * TRIANGLE)} {num(y + cy * TRIANGLE)}" for cx, cy in corners)
        return f'<path d="M{points}Z"{data}/>'
    return rectangle(body(symbol), (f' rx="{num(RADIUS)}"' if symbol.kind == "pill" else "") + data)


def rectangle(shape: Shape, more: str) -> str:
    return (f'<rect x="{num(shape.left)}" y="{num(shape.top)}" width="{num(shape.right - shape.left)}" '
            f'height="{num(shape.bottom - shape.top)}"{more}/>')


def plus(symbol: Symbol) -> str:
    x, y = symbol.at[0] * GRID, symbol.at[1] * GRID
    return f'<path d="M{num(x - PLUS)} {num(y)}H{num(x + PLUS)}M{num(x)} {num(y - PLUS)}V{num(y + PLUS)}"/>'


def names(layout: Layout) -> Iterator[str]:
    for symbol in layout.sheet.symbols:
        x, y = symbol.at[0] * GRID, symbol.at[1] * GRID
        if symbol.text:
            yield label(symbol.text, x, y + text.SIZE * 0.34, "middle")
        if symbol.kind in ("mark", "round"):
            yield letter_q(x, y)
        if symbol.marked:
            mark = mark_shape(symbol)
            yield letter_q((mark.left + mark.right) / 2, (mark.top + mark.bottom) / 2)
    for placed in layout.labels:
        left, base = placed.base
        centre = placed.symbol.at[0] * GRID
        anchor = "middle" if left < centre < placed.shape.right else "start" if left >= centre else "end"
        across = {"start": left, "end": placed.shape.right, "middle": (left + placed.shape.right) / 2}
        size, ink = (VALUE_SIZE, VALUE_INK) if placed.is_value else (text.SIZE, "")
        yield label(placed.text, across[anchor], base, anchor, size, ink)


def letter_q(x: float, y: float) -> str:
    return (f'<text x="{num(x)}" y="{num(y + Q_SIZE * 0.36)}" text-anchor="middle" font-family="{SANS}" '
            f'font-size="{num(Q_SIZE)}" font-weight="bold">Q</text>')


def label(runs: text.Label, x: float, y: float, anchor: str = "start", size: float = text.SIZE, ink: str = "") -> str:
    pieces, height = [], 0.0
    for run in runs:
        wanted = {0: 0.0, -1: DROP, 1: -RISE}[run.level] * size
        style = ' font-style="italic"' if run.italic else ""
        style += f' font-size="{num(size * run.size)}"' if run.level else ""
        style += f' dy="{num(wanted - height)}"' if wanted != height else ""
        pieces.append(f"<tspan{style}>{escape(run.text)}</tspan>" if style else escape(run.text))
        height = wanted
    where = "" if anchor == "start" else f' text-anchor="{anchor}"'
    where += f' font-size="{num(size)}" fill="{ink}"' if ink else ""
    return f'<text x="{num(x)}" y="{num(y)}"{where}>{"".join(pieces)}</text>'


def column_widths(table: Table) -> list[float]:
    columns = zip(*table.rows, strict=True)
    return [max(text.width(cell, TABLE_SIZE) for cell in (head, *cells))
            for head, cells in zip(table.heads, columns, strict=True)]


def table_pieces(table: Table, widths: Sequence[float], left: float, top: float) -> Iterator[str]:
    """Rules above, under the heads and below; numbers set to the right."""
    rights = [left + sum(widths[: i + 1]) + TABLE_GAP * i for i in range(len(widths))]
    rules = ((0.0, 1.2), (TABLE_ROW * 1.2, 0.6), (TABLE_ROW * (len(table.rows) + 1.5), 1.2))
    first = top - TABLE_ROW
    yield '<g data-part="rules" stroke="#000">'
    for down, wide in rules:
        y = num(first + down)
        yield f'<path d="M{num(left - 6)} {y}H{num(rights[-1] + 6)}" stroke-width="{wide}"/>'
    yield f'</g>\n<g data-part="values" font-size="{num(TABLE_SIZE)}">'
    yield from (label(head, right, first + TABLE_ROW * 0.8, "end", TABLE_SIZE)
                for head, right in zip(table.heads, rights, strict=True))
    for number, row in enumerate(table.rows):
        base = first + TABLE_ROW * (number + 2.1)
        yield from (label(cell, right, base, "end", TABLE_SIZE) for cell, right in zip(row, rights, strict=True) if cell)
    yield "</g>"


def bounds(layout: Layout) -> Shape:
    """The box around all that is drawn."""
    shapes = [body(symbol) for symbol in layout.sheet.symbols] + [placed.shape for placed in layout.labels]
    shapes += [mark_shape(symbol) for symbol in layout.sheet.symbols if symbol.marked]
    for source in layout.nets:
        shapes += [Shape(line.x0, line.y0, line.x1, line.y1) for line in lines_of(layout, source).all]
    left, top = min(shape.left for shape in shapes), min(shape.top for shape in shapes)
    return Shape(left, top, max(shape.right for shape in shapes), max(shape.bottom for shape in shapes))


def num(value: float) -> str:
    """A number with at most two decimals, the same on every machine."""
    text_of = f"{value:.2f}".rstrip("0").rstrip(".")
    return "0" if text_of == "-0" else text_of
