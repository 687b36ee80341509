"""Drawings as a real browser shows them, with the fonts that it has: no text touches anything, nothing leaves the page."""

import os
from pathlib import Path

import pytest
from browser import Measured, browser, faults_of, measure
from drawn_forms import whole
from gallery import drawings

from streamhost.drawing import svg

pytestmark = pytest.mark.skipif(browser() is None and "CI" not in os.environ, reason="there is no chromium here")


@pytest.fixture(scope="module")
def shown(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Measured]:
    texts = drawings()
    return dict(zip(texts, measure(list(texts.values()), tmp_path_factory.mktemp("browser")), strict=True))


def test_no_text_touches_anything_and_nothing_leaves_the_page(shown: dict[str, Measured]) -> None:
    assert {name: faults for name, drawing in shown.items() if (faults := faults_of(drawing))} == {}
    assert all(drawing.texts and drawing.lines and drawing.symbols for drawing in shown.values())


def test_what_touches_is_seen(tmp_path: Path) -> None:
    """A name moved onto a line, onto its gain, onto another name, and out of the page, one at a time."""
    text = svg(whole("direct-2", 1, 1))
    (good,) = measure([text], tmp_path)
    assert faults_of(good) == []
    place = text.index('<text x="')
    end = text.index(">", place)
    spots = {"touches a line": (100, 4), "touches a symbol": (0, 0), "leaves the page": (-500, 4)}
    broken = [text[:place] + f'<text x="{x}" y="{y}" text-anchor="middle"' + text[end:] for x, y in spots.values()]
    for expected, drawing in zip(spots, measure(broken, tmp_path), strict=True):
        assert any(expected in fault for fault in faults_of(drawing)), expected
