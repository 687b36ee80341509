"""A layout as SVG text: groups of wires, dots, heads, symbols, signs and names, and the table of values under them.

Text stays text. The stroke widths and fonts are attributes of groups, so that several drawings in one page do not meet.
"""

from collections.abc import Iterator, Sequence
from xml.sax.saxutils import escape, quoteattr

from streamhost.drawing import text
from streamhost.drawing.labels import Shape, body, mark_shape, minus_shape
from streamhost.drawing.layout import Layout
from streamhost.drawing.strokes import Head, Line, dots_of, heads_of, lines_of
from streamhost.drawing.symbols import DOT, GRID, HEAD, RADIUS, STEP, TERMINAL, TRIANGLE, Symbol
from streamhost.drawing.table import Table

FONT = "'STIX Two Text','Latin Modern Roman','Times New Roman','DejaVu Serif',serif"
SANS = "'Helvetica','Arial','DejaVu Sans',sans-serif"
MM = 25.4 / 96
PAGE, PAGE_HEIGHT = 180.0, 255.0
"""Width and height of a page's text in mm: a larger drawing is scaled down to them."""

BORDER = 8.0
PLUS = 5.0
TABLE_SIZE, TABLE_ROW, TABLE_GAP, TABLE_OFF = 11.0, 16.0, 18.0, 26.0
Q_SIZE = 9.0
DROP, RISE = 0.26, 0.38
"""How far subscripts and superscripts are off the base line, in units of the size."""


def svg_of(layout: Layout, table: Table | None, title: str, caption: str = "") -> str:
    """The drawing as the text of an SVG file."""
    box = bounds(layout)
    below = box.bottom + TABLE_OFF
    pieces = list(drawing(layout))
    if caption:
        words = text.sentence(caption)
        written = label(words, box.left, below, size=TABLE_SIZE)
        pieces += [f'<g data-part="caption" font-size="{num(TABLE_SIZE)}">', written, "</g>"]
        box = Shape(box.left, box.top, max(box.right, box.left + text.width(words, TABLE_SIZE)), below + 4)
        below += TABLE_OFF
    if table is not None:
        widths = column_widths(table)
        wide = sum(widths) + TABLE_GAP * (len(widths) - 1)
        left = max(box.left, (box.left + box.right - wide) / 2)
        pieces += table_pieces(table, widths, left, below)
        box = Shape(box.left, box.top, max(box.right, left + wide), below + TABLE_ROW * (len(table.rows) + 0.5))
    return framed(box.grown(BORDER), pieces, title)


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
    yield '<g data-part="wires" fill="none" stroke="#000" stroke-width="1.2" stroke-linecap="square">'
    yield from (path(lines_of(layout, source)) for source in layout.nets)
    yield '</g>\n<g data-part="dots">'
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
        yield label(placed.symbol.name, across[anchor], base, anchor)


def letter_q(x: float, y: float) -> str:
    return (f'<text x="{num(x)}" y="{num(y + Q_SIZE * 0.36)}" text-anchor="middle" font-family="{SANS}" '
            f'font-size="{num(Q_SIZE)}" font-weight="bold">Q</text>')


def label(runs: text.Label, x: float, y: float, anchor: str = "start", size: float = text.SIZE) -> str:
    pieces, height = [], 0.0
    for run in runs:
        wanted = {0: 0.0, -1: DROP, 1: -RISE}[run.level] * size
        style = ' font-style="italic"' if run.italic else ""
        style += f' font-size="{num(size * run.size)}"' if run.level else ""
        style += f' dy="{num(wanted - height)}"' if wanted != height else ""
        pieces.append(f"<tspan{style}>{escape(run.text)}</tspan>" if style else escape(run.text))
        height = wanted
    where = "" if anchor == "start" else f' text-anchor="{anchor}"'
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
        yield from (label(cell, right, base, "end", TABLE_SIZE) for cell, right in zip(row, rights, strict=True))
    yield "</g>"


def bounds(layout: Layout) -> Shape:
    """The box around all that is drawn."""
    shapes = [body(symbol) for symbol in layout.sheet.symbols] + [placed.shape for placed in layout.labels]
    for source in layout.nets:
        shapes += [Shape(line.x0, line.y0, line.x1, line.y1) for line in lines_of(layout, source)]
    left, top = min(shape.left for shape in shapes), min(shape.top for shape in shapes)
    return Shape(left, top, max(shape.right for shape in shapes), max(shape.bottom for shape in shapes))


def num(value: float) -> str:
    """A number with at most two decimals, the same on every machine."""
    text_of = f"{value:.2f}".rstrip("0").rstrip(".")
    return "0" if text_of == "-0" else text_of
