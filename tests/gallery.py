"""A contact sheet of all forms, and drawings of every form and of what else there is to draw, for a test and for the eye.

`python tests/gallery.py page.html` writes the contact sheet: each form once, with its order and its counts, in a grid that
prints on A4. `python tests/gallery.py page.html all` writes all drawings, each as large as it prints.
"""

import re
import sys
from collections.abc import Callable
from html import escape
from pathlib import Path
from random import Random

from drawn_forms import cascade, complementary, sums, tapped, whole
from form_filters import DIRECT, RATE, built, carried
from random_diagrams import random_diagram

from streamhost import Filter, design
from streamhost.diagram import Diagram
from streamhost.drawing import svg
from streamhost.errors import StructureError
from streamhost.structures import build, form, forms

OTHERS = (("whole", "low-pass at 1 kHz"), ("whole", "chebyshev 4"), ("cascade", "elliptic 5"), ("whole", "taps"))
"""What is drawn in the forms that do not draw a numerator and a denominator as they are written."""


def drawings() -> dict[str, str]:
    """Every form, whole and in cascade, with marks and with values beside; tapped lines; graphs without places."""
    found = {}
    for name in DIRECT:
        for order in (1, 2, 6):
            found[f"{name}, order {order}"] = svg(whole(name, order, order))
        found[f"{name}, 3 sections, marks"] = svg((diagram := cascade(name, 3)), rounded=sums(diagram))
        found[f"{name}, 4 sections, values beside"] = svg(cascade(name, 4), values="beside")
        found[f"{name}, 9 sections"] = svg(cascade(name, 9))
        found[f"{name}, 20 taps, marks"] = svg((diagram := whole(name, 19, 0)), rounded=sums(diagram))
    for name in forms():
        if name not in DIRECT:
            found |= {f"{name}, {how}, {which}": svg((diagram := built(name, how, which).diagram), rounded=sums(diagram))
                      for how, which in OTHERS if which in carried(name, how)}
    found["20 taps, values beside"] = svg(whole("direct-1", 19, 0), values="beside")
    for kind in ("plain", "odd"):
        found[f"tapped line, {kind}"] = svg(tapped(20, kind))
    found["tapped line in a box"] = svg(complementary())
    found |= {f"graph {seed}": svg(random_diagram(Random(seed), 16, stable=False)) for seed in (1, 2, 5)}
    return found


SHOWN = (
    design("low-pass", rate=RATE, frequency=1000, q=0.707),
    design("butterworth", rate=RATE, response="low-pass", order=3, frequency=1000),
    Filter.from_coefficients([0.125, 0.25, 0.375, 0.25, 0.125], rate=RATE),
    Filter.from_coefficients([0.5, 0.375, 0.25, 0.125], rate=RATE),
    design("moving-average", rate=RATE, length=8),
)
"""The contact sheet has each form with the first of these that it carries."""

SMALLER, LEAST = 0.75, 0.6
"""The contact sheet's scale, at which names are 7 points high, and the least; what is wider gets both columns."""

HALF_MM, WHOLE_MM = 90.0, 184.0

STYLE = """@page { size: A4; margin: 10mm }
body { margin: 0; width: 190mm; font: 8pt "DejaVu Serif", serif }
h1 { font-size: 12pt; margin: 0 0 2mm }
main { display: grid; grid-template-columns: 1fr 1fr; gap: 2mm; grid-auto-flow: dense }
figure { margin: 0; padding: 1.5mm; border: 0.2mm solid #999; break-inside: avoid; text-align: center }
figure.wide { grid-column: span 2 }
sup { line-height: 0 }
figcaption { margin-bottom: 1.5mm; text-align: left }"""


LEGEND = "<p>× multiplications, + additions, z<sup>−1</sup> words of memory a frame. Heavy lines are loops.</p>"


def contact_sheet() -> str:
    """The page of all forms."""
    cells = "\n".join(cell(name, *shown(name)) for name in forms())
    return f"{HEAD}<style>{STYLE}</style>\n<h1>{len(forms())} forms</h1>\n{LEGEND}\n<main>\n{cells}\n</main>\n"


def shown(name: str) -> tuple[Filter, Diagram]:
    """A filter that a form carries, and the form's diagram of it."""
    for filter in SHOWN:
        try:
            return filter, build(filter, form=name, decomposition="whole").diagram
        except StructureError:
            continue
    raise AssertionError(f"{name} carries none of the filters on the contact sheet")


def cell(name: str, filter: Filter, diagram: Diagram) -> str:
    """A form's place on the sheet: its name, order and counts above the drawing."""
    text = svg(diagram, values="none")
    wide, high = (float(size) for size in re.findall(r'(?:width|height)="([\d.]+)mm"', text)[:2])
    spans = wide * LEAST > HALF_MM
    scale = min(SMALLER, (WHOLE_MM if spans else HALF_MM) / wide)
    small = re.sub(r'width="[\d.]+mm" height="[\d.]+mm"', f'width="{wide * scale:.2f}mm" height="{high * scale:.2f}mm"', text)
    counts = diagram.counts()
    said = f"order {order_of(filter)}, {counts.multiplications} ×, {counts.additions} +, {counts.delays} z<sup>−1</sup>"
    head = f"<b>{escape(name)}</b>&ensp;{said}<br>{escape(form(name).summary)}"
    return f'<figure{" class=wide" if spans else ""}><figcaption>{head}</figcaption>\n{small}</figure>'


def order_of(filter: Filter) -> int:
    b, a = filter.ratio()
    return max(len(b), len(a)) - 1


def every_drawing() -> str:
    """The page of all drawings."""
    return HEAD + "\n".join(f"<h4>{escape(name)}</h4>\n{text}" for name, text in drawings().items())


HEAD = "<!doctype html>\n<meta charset=utf-8>\n"
PAGES: dict[str, Callable[[], str]] = {"": contact_sheet, "all": every_drawing}

if __name__ == "__main__":
    Path(sys.argv[1]).write_text(PAGES["".join(sys.argv[2:])](), encoding="utf-8")
