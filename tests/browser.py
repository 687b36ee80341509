"""Drawings measured by a real browser: where it puts the ink of every text, and the lines and symbols around it."""

import json
import shutil
import subprocess
from dataclasses import dataclass
from html import unescape
from pathlib import Path

# Without a window, a profile of its own, and nothing that would ask the network.
FLAGS = ("--headless", "--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run", "--disable-background-networking",
         "--disable-component-update", "--disable-sync")

# The ink of a character: its place along the line from the layout, its height from a canvas with the same font.
SCRIPT = """
const pen = document.createElement('canvas').getContext('2d');
function onPage(svg, element, x0, y0, x1, y1) {
  const m = svg.getScreenCTM().inverse().multiply(element.getScreenCTM());
  const a = new DOMPoint(x0, y0).matrixTransform(m), b = new DOMPoint(x1, y1).matrixTransform(m);
  return [a.x, a.y, b.x, b.y];
}
function characters(svg, text) {
  const found = [];
  const walker = document.createTreeWalker(text, NodeFilter.SHOW_TEXT);
  let i = 0;
  for (let node = walker.nextNode(); node; node = walker.nextNode()) {
    const style = getComputedStyle(node.parentElement);
    pen.font = `${style.fontStyle} ${style.fontWeight} ${style.fontSize} ${style.fontFamily}`;
    for (const character of node.data) {
      const where = text.getExtentOfChar(i), base = text.getStartPositionOfChar(i).y, ink = pen.measureText(character);
      if (character.trim())
        found.push(onPage(svg, text, where.x, base - ink.actualBoundingBoxAscent, where.x + where.width,
                          base + ink.actualBoundingBoxDescent));
      i += 1;
    }
  }
  return found;
}
function boxes(svg, query) {
  return [...svg.querySelectorAll(query)].map(e => {
    const b = e.getBBox();
    return onPage(svg, e, b.x, b.y, b.x + b.width, b.y + b.height);
  });
}
function strokes(svg, part) {
  return [...svg.querySelectorAll(`[data-part="${part}"] path`)].flatMap(e => {
    const half = parseFloat(getComputedStyle(e).strokeWidth) / 2;
    return [...e.getAttribute('d').matchAll(/M([-\\d.]+) ([-\\d.]+)([HV])([-\\d.]+)/g)].map(([, x, y, way, end]) => {
      const [x1, y1] = way === 'H' ? [+end, +y] : [+x, +end];
      return onPage(svg, e, Math.min(x, x1) - half, Math.min(y, y1) - half, Math.max(x, x1) + half, Math.max(y, y1) + half);
    });
  });
}
function measured(svg) {
  const page = svg.viewBox.baseVal;
  return {
    texts: [...svg.querySelectorAll('text')].map(t => ({words: t.textContent, ink: characters(svg, t)})),
    lines: ['wires', 'loops', 'minus', 'rules'].flatMap(part => strokes(svg, part)),
    heads: boxes(svg, '[data-part="heads"] path'),
    symbols: boxes(svg, '[data-part="symbols"] > *'),
    page: [page.x, page.y, page.x + page.width, page.y + page.height],
  };
}
let result;
try {
  result = [...document.querySelectorAll('svg')].map(measured);
} catch (error) {
  result = String(error.stack);
}
const out = document.createElement('pre');
out.id = 'measured';
out.textContent = JSON.stringify(result);
document.body.append(out);
"""

Rectangle = tuple[float, float, float, float]


@dataclass(frozen=True)
class Text:
    """Some words, and the ink of each character."""

    words: str
    ink: tuple[Rectangle, ...]


@dataclass(frozen=True)
class Measured:
    """One drawing, in px of its own, as the browser shows it."""

    texts: tuple[Text, ...]
    lines: tuple[Rectangle, ...]
    heads: tuple[Rectangle, ...]
    symbols: tuple[Rectangle, ...]
    page: Rectangle


def browser() -> str | None:
    return shutil.which("chromium")


def measure(drawings: list[str], folder: Path) -> list[Measured]:
    """All drawings on one page, measured in one run of the browser."""
    page = folder / "page.html"
    page.write_text(f"<!doctype html><meta charset=utf-8><body>{''.join(drawings)}<script>{SCRIPT}</script>", encoding="utf-8")
    program = browser()
    assert program is not None, "the browser is there"
    command = [program, *FLAGS, f"--user-data-dir={folder / 'profile'}", "--dump-dom", page.as_uri()]
    done = subprocess.run(command, capture_output=True, text=True, timeout=120)
    assert '<pre id="measured">' in done.stdout, done.stderr[-2000:]
    result = json.loads(unescape(done.stdout.split('<pre id="measured">')[1].split("</pre>")[0]))
    assert isinstance(result, list), result
    return [read(entry) for entry in result]


def read(entry: dict[str, list[object]]) -> Measured:
    texts = tuple(Text(text["words"], tuple(map(tuple, text["ink"]))) for text in entry["texts"])  # type: ignore[index, call-overload]
    rest = {key: tuple(map(tuple, entry[key])) for key in ("lines", "heads", "symbols")}  # type: ignore[call-overload, arg-type]
    return Measured(texts, page=tuple(entry["page"]), **rest)  # type: ignore[arg-type]


def meet(a: Rectangle, b: Rectangle) -> bool:
    return a[0] < b[2] and b[0] < a[2] and a[1] < b[3] and b[1] < a[3]


def holds(outer: Rectangle, inner: Rectangle) -> bool:
    return outer[0] <= inner[0] and outer[1] <= inner[1] and inner[2] <= outer[2] and inner[3] <= outer[3]


def around(rectangles: tuple[Rectangle, ...]) -> Rectangle:
    left, top, right, bottom = zip(*rectangles, strict=True)
    return min(left), min(top), max(right), max(bottom)


def faults_of(drawing: Measured) -> list[str]:
    """Texts that leave the page or their symbol, or touch a line, a symbol that is not theirs, or each other."""
    faults = []
    for number, text in enumerate(drawing.texts):
        box = around(text.ink)
        if not holds(drawing.page, box):
            faults.append(f'"{text.words}" leaves the page')
        middle = ((box[0] + box[2]) / 2, (box[1] + box[3]) / 2) * 2
        for symbol in (symbol for symbol in drawing.symbols if meet(symbol, box)):
            if not holds(symbol, middle):
                faults.append(f'"{text.words}" touches a symbol')
            elif not holds(symbol, box):
                faults.append(f'"{text.words}" leaves its symbol')
        faults += [f'"{text.words}" touches a line' for line in (*drawing.lines, *drawing.heads)
                   if any(meet(line, ink) for ink in text.ink)
                   and not any(holds(symbol, box) for symbol in drawing.symbols)]
        faults += [f'"{text.words}" and "{other.words}" touch' for other in drawing.texts[:number]
                   if any(meet(a, b) for a in text.ink for b in other.ink)]
    return faults
