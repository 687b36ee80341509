"""Drawings of every form and of what else there is to draw, for the browser's test and for the eye.

`python tests/gallery.py page.html` writes them all on one page, each as large as it prints.
"""

import sys
from html import escape
from pathlib import Path
from random import Random

from form_filters import DIRECT, built, carried
from random_diagrams import random_diagram
from test_drawing_forms import cascade, sums, whole
from test_drawing_taps import complementary, tapped

from streamhost.drawing import svg
from streamhost.structures import forms

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


if __name__ == "__main__":
    figures = "\n".join(f"<h4>{escape(name)}</h4>\n{text}" for name, text in drawings().items())
    Path(sys.argv[1]).write_text(f"<!doctype html>\n<meta charset=utf-8>\n{figures}", encoding="utf-8")
