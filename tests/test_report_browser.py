"""The report in a real browser, from disk: nothing asked for elsewhere, no complaint, texts inside, keys and pointer."""

import os
import re
from collections.abc import Iterator
from pathlib import Path

import pytest
from browser import browser
from browser_session import Session

pytestmark = pytest.mark.skipif(browser() is None and "CI" not in os.environ, reason="there is no chromium here")

SIZES = {"wide": (1280, 720), "narrow": (400, 800)}

# Texts that leave their drawing, or are smaller than 13 px on the page; what sticks out of the page to the right.
FAULTS = """(() => {
  const faults = [], page = document.documentElement.clientWidth;
  for (const svg of document.querySelectorAll("svg.chart")) {
    const frame = svg.getBoundingClientRect();
    for (const text of svg.querySelectorAll("text")) {
      const box = text.getBoundingClientRect();
      if (box.left < frame.left - 1 || box.right > frame.right + 1 || box.top < frame.top - 1 || box.bottom > frame.bottom + 1)
        faults.push(`${svg.dataset.key}: "${text.textContent}" leaves its drawing`);
    }
    const size = frame.width / svg.viewBox.baseVal.width * parseFloat(getComputedStyle(svg).fontSize);
    if (size < 12.9) faults.push(`${svg.dataset.key}: texts of ${size} px`);
    const labels = [...svg.querySelectorAll(".scale text")].map(each => each.getBoundingClientRect());
    labels.forEach((a, i) => labels.slice(0, i).forEach(b => {
      if (a.left < b.right && b.left < a.right && a.top + 3 < b.bottom - 3 && b.top + 3 < a.bottom - 3)
        faults.push(`${svg.dataset.key}: two texts of its scales touch`);
    }));
  }
  for (const each of document.querySelectorAll("h1, h2, p, figure, table, pre, audio, .panel"))
    if (!each.closest(".scroll, .drawing") && !each.matches(".unseen") && each.getBoundingClientRect().right > page + 1)
      faults.push(`${each.tagName} sticks out`);
  if (document.documentElement.scrollWidth > page) faults.push("the page is wider than the window");
  return faults;
})()"""
TICKS = """[...document.querySelectorAll("#figure-2 .chart")].map(
  svg => [...svg.querySelectorAll(".scale text")].map(each => each.textContent).join(" "))"""
CURVE = 'document.querySelector("#figure-2 .chart .heard").getAttribute("d")'


@pytest.fixture(scope="module")
def session(report: Path, tmp_path_factory: pytest.TempPathFactory) -> Iterator[Session]:
    """A browser on a report whose titles and names try to be more than text."""
    with Session(tmp_path_factory.mktemp("browser")) as running:
        running.address = (report / "index.html").as_uri()
        yield running


@pytest.fixture
def page(session: Session) -> Session:
    session.size(*SIZES["wide"])
    session.media()
    session.open(session.address)
    return session


def test_it_opens_from_disk_without_complaint_and_without_a_network(page: Session) -> None:
    assert page.errors == []
    assert page.requests and {address.split(":")[0] for address in page.requests} <= {"file", "data"}
    assert page.ask("document.title").startswith("Peak </script>")  # a title is text
    assert page.ask("document.scripts.length") == 2


@pytest.mark.parametrize("size", SIZES)
@pytest.mark.parametrize("scheme", ["light", "dark"])
def test_no_text_leaves_its_place(page: Session, size: str, scheme: str) -> None:
    page.size(*SIZES[size])
    page.media(scheme=scheme)
    page.open(page.address)
    assert page.ask(FAULTS) == []


def test_the_check_sees_what_sticks_out(page: Session) -> None:
    page.ask('document.querySelector(".chart text").setAttribute("x", "-30")')
    page.ask('document.querySelector("h1").style.width = "3000px"')
    faults = page.ask(FAULTS)
    assert any("leaves its drawing" in fault for fault in faults) and "H1 sticks out" in faults


def test_light_and_dark_follow_the_system(page: Session) -> None:
    sheet = 'getComputedStyle(document.querySelector("main")).backgroundColor'
    assert page.ask(sheet) == "rgb(245, 248, 242)"
    page.media(scheme="dark")
    assert page.ask(sheet) == "rgb(25, 33, 29)"
    assert page.ask('getComputedStyle(document.querySelector(".drawing svg")).color') == "rgb(227, 234, 227)"


def test_tab_walks_the_page_in_its_order_and_the_focus_is_seen(page: Session) -> None:
    seen = []
    for _ in range(8):
        page.press("Tab")
        seen.append(page.ask("(e => [e.tagName, e.getBoundingClientRect().top + scrollY, getComputedStyle(e).outlineStyle])"
                             "(document.activeElement)"))
    assert [top for _, top, _ in seen] == sorted(top for _, top, _ in seen)
    assert {outline for *_, outline in seen} == {"solid"}
    assert "svg" in {tag for tag, *_ in seen}


def test_keys_zoom_all_charts_of_a_figure_and_zero_shows_the_whole(page: Session) -> None:
    whole, curve = page.ask(TICKS), page.ask(CURVE)
    page.ask('document.querySelector("#figure-2 .chart").focus()')
    for _ in range(6):
        page.press("+")
    near = page.ask(TICKS)
    assert len(near) == 2 and all(a != b for a, b in zip(whole, near, strict=True))
    assert page.ask('document.getElementById("told").textContent') != ""
    page.press("ArrowRight")
    page.press("ArrowUp", shift=True)
    assert page.ask(TICKS) != near
    page.press("0")
    assert page.ask(TICKS) == whole
    # the script and the page draw alike: numbers in the data have seven digits, so that a tenth of a pixel can differ
    (static, drawn) = (points(each) for each in (curve, page.ask(CURVE)))
    assert len(static) == len(drawn) > 100
    assert max(abs(a - b) for one, other in zip(static, drawn, strict=True) for a, b in zip(one, other, strict=True)) <= 0.11
    assert page.errors == []


def points(path: str) -> list[tuple[float, float]]:
    """The points of a curve that lie in a drawing 372 px wide."""
    numbers = [float(each) for each in path.replace("M", " ").replace("L", " ").split()]
    return [(x, y) for x, y in zip(numbers[::2], numbers[1::2], strict=True) if 0.0 <= x <= 372.0]


def test_a_drag_zooms_to_what_it_covers(page: Session) -> None:
    page.ask('document.querySelector("#figure-2 .chart").scrollIntoView({block: "center"})')
    left, top, wide, high = page.ask('(b => [b.left, b.top, b.width, b.height])'
                                     '(document.querySelector("#figure-2 .chart").getBoundingClientRect())')
    before = page.ask(TICKS)
    page.drag((left + 0.4 * wide, top + 0.5 * high), (left + 0.6 * wide, top + 0.5 * high))
    after = page.ask(TICKS)
    assert before != after and all(after)


def test_sound_begins_low_and_is_not_loaded_before(page: Session) -> None:
    players = page.ask("[...document.querySelectorAll('audio')].map(e => [e.volume, e.preload, e.paused])")
    assert players == [[pytest.approx(0.1), "none", True]] * 4
    assert not any(".wav" in address for address in page.requests)
    assert page.ask("(e => new Promise(done => { e.onloadedmetadata = () => done(e.duration); e.onerror = () => done('fails');"
                    "e.load(); e.preload = 'metadata'; }))(document.querySelector('audio'))") == pytest.approx(1.0)


def test_it_prints_on_a4(page: Session, tmp_path: Path) -> None:
    page.print(tmp_path / "report.pdf")
    printed = (tmp_path / "report.pdf").read_bytes()
    sizes = {(float(wide), float(high)) for wide, high in re.findall(rb"/MediaBox \[0 0 ([\d.]+) ([\d.]+)\]", printed)}
    assert sizes and all(size == pytest.approx((595.3, 841.9), abs=0.6) for size in sizes)  # 210 by 297 mm in points
    page.media(kind="print")
    page.size(658, 1000)  # 174 mm
    assert page.ask('getComputedStyle(document.querySelector("main")).backgroundColor') == "rgb(255, 255, 255)"
    assert page.ask('getComputedStyle(document.querySelector(".sound")).display') == "none"
    assert page.ask("document.documentElement.scrollWidth") <= 658


def test_it_is_whole_without_script(page: Session) -> None:
    page.send("Emulation.setScriptExecutionDisabled", value=True)
    try:
        page.send("Page.reload")
        page.open(page.address)
        page.ask("0")
    finally:
        page.send("Emulation.setScriptExecutionDisabled", value=False)
    assert page.ask('document.querySelectorAll("svg.chart .heard").length') > 4
    assert page.ask('document.getElementById("zooming").hidden') is True
