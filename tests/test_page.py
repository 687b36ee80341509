"""The control page against a host on the clock: who is let in, what a page may send, what a browser shows and does."""

import json
import os
import socket
import threading
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path

import numpy as np
import pytest
from browser import browser
from websockets import Origin
from websockets.exceptions import ConnectionClosed, InvalidStatus
from websockets.sync.client import ClientConnection, connect

from streamhost import Filter, realize
from streamhost.commands.listening.page import section_drawing
from streamhost.formats import Fixed
from streamhost.host import Device, Host, Lane
from streamhost.host.clock import run_on_clock
from streamhost.host.sources import generated
from streamhost.measure import predicted_noise
from streamhost.page import ClockSitting, Page
from streamhost.page.messages import A_SECOND, AT_ONCE, LONGEST, Allowance
from streamhost.page.spectra import FRAMES, POINTS, Theory, spectrum

RATE = 48000.0
BLOCK = 128
TITLES = ("Low pass, 16 bits", "Low pass, 32-bit float")
SECTIONS = Filter.from_sections([[0.02, 0.04, 0.02, 1.0, -1.5, 0.58], [0.05, 0.1, 0.05, 1.0, -1.6, 0.8]], rate=RATE)


@contextmanager
def served() -> Iterator[tuple[Page, Host]]:
    """A page of two lanes, driven in real time by a thread of the test's."""
    realizations = [realize(SECTIONS, form="direct-1", format=Fixed("Q1.15")), realize(SECTIONS, format="float32")]
    lanes = [Lane(each, 2, metered=isinstance(each.format, Fixed), ideal=True) for each in realizations]
    host = Host(lanes, BLOCK, device=Device(0, 2), source=generated("white", RATE, 2), recent=1 << 15)
    sitting = ClockSitting(host, TITLES)
    ending = threading.Event()
    with Page(sitting, section_drawing) as page:
        def run() -> None:
            while not ending.is_set():
                run_on_clock(host, 8 * BLOCK, between=page.attend)

        driver = threading.Thread(target=run)
        driver.start()
        try:
            yield page, host
        finally:
            ending.set()
            driver.join()


@pytest.fixture(scope="module")
def running() -> Iterator[tuple[Page, Host]]:
    with served() as both:
        yield both


def until(happens: Callable[[], bool], seconds: float = 10.0) -> bool:
    waited = threading.Event()
    for _ in range(int(seconds * 100)):
        if happens():
            return True
        waited.wait(0.01)
    return False


@contextmanager
def visit(page: Page, *, origin: str | None = None, first: str | None = None) -> Iterator[ClientConnection]:
    """A page that has opened with its key, or with another first message."""
    key = json.dumps({"do": "open", "key": page.address.partition("#")[2]})
    with connect(f"ws://127.0.0.1:{page.port}/live", origin=Origin(origin or f"http://127.0.0.1:{page.port}"),
                 proxy=None) as connection:
        connection.send(key if first is None else first)
        yield connection


def ask(connection: ClientConnection, **message: object) -> None:
    connection.send(json.dumps(message))


def picture(connection: ClientConnection) -> dict[str, object]:
    ask(connection, do="next")
    return json.loads(connection.recv(timeout=10))  # type: ignore[no-any-return]


def raw(port: int, *lines: str) -> str:
    """What the server answers to these lines, as they are."""
    with socket.create_connection(("127.0.0.1", port), timeout=10) as connection:
        ends = [] if "Connection: Upgrade" in lines else ["Connection: close"]
        connection.sendall("\r\n".join([*lines, *ends, "", ""]).encode())
        found = b""
        while part := connection.recv(65536):
            found += part
    return found.decode("latin-1")


def status(answer: str) -> int:
    return int(answer.split()[1])


def test_the_page_has_a_policy_and_names_nothing_of_others(running: tuple[Page, Host]) -> None:
    page, _ = running
    answer = raw(page.port, "GET / HTTP/1.1", f"Host: 127.0.0.1:{page.port}")
    head, _, body = answer.partition("\r\n\r\n")
    assert status(answer) == 200
    assert "content-security-policy: default-src 'none'" in head.lower()
    assert "unsafe" not in head
    assert "http:" not in body and "https:" not in body


@pytest.mark.parametrize(
    "lines",
    [
        ("GET / HTTP/1.1", "Host: evil.example:{port}"),  # a name that was bound to this machine afterwards
        ("GET / HTTP/1.1", "Host: 127.0.0.1.evil.example:{port}"),
        ("GET / HTTP/1.1", "Host: 127.0.0.1:{other}"),
        ("GET / HTTP/1.1", "Host: 127.0.0.1"),
        ("GET / HTTP/1.1", "Host: 127.0.0.1:{port}", "Origin: http://evil.example"),
        ("GET / HTTP/1.1", "Host: 127.0.0.1:{port}", "Origin: null"),
        ("GET / HTTP/1.1", "Host: 127.0.0.1:{port}", "Sec-Fetch-Site: cross-site"),
        ("GET / HTTP/1.1", "Host: 127.0.0.1:{port}", "Origin: http://127.0.0.1:{port}", "Origin: http://evil.example"),
        ("POST / HTTP/1.1", "Host: 127.0.0.1:{port}", "Content-Length: 0"),
        ("GET /live HTTP/1.1", "Host: 127.0.0.1:{port}", "Upgrade: websocket", "Connection: Upgrade",
         "Sec-WebSocket-Version: 13", "Sec-WebSocket-Key: AAAAAAAAAAAAAAAAAAAAAA=="),  # no Origin
        ("GET /live HTTP/1.1", "Host: evil.example:{port}", "Upgrade: websocket", "Connection: Upgrade",
         "Sec-WebSocket-Version: 13", "Sec-WebSocket-Key: AAAAAAAAAAAAAAAAAAAAAA==", "Origin: http://evil.example:{port}"),
    ],
)
def test_other_sites_and_other_names_are_refused(lines: tuple[str, ...], running: tuple[Page, Host]) -> None:
    port = running[0].port
    assert status(raw(port, *(line.format(port=port, other=port + 1) for line in lines))) in (400, 403)


@pytest.mark.parametrize("path", ["/../pyproject.toml", "/%2e%2e/serving.py", "//etc/passwd", "/static/main.js", "/index.html"])
def test_no_file_is_named_by_a_request(path: str, running: tuple[Page, Host]) -> None:
    port = running[0].port
    assert status(raw(port, f"GET {path} HTTP/1.1", f"Host: 127.0.0.1:{port}")) == 404


def test_a_socket_of_another_site_is_refused(running: tuple[Page, Host]) -> None:
    with pytest.raises(InvalidStatus) as refused, visit(running[0], origin="http://evil.example"):
        pass
    assert refused.value.response.status_code == 403


@pytest.mark.parametrize("first", ['{"do":"open","key":"guessed"}', '{"do":"mute"}', "nonsense", '{"do":"open"}'])
def test_nobody_enters_without_the_key(first: str, running: tuple[Page, Host]) -> None:
    with visit(running[0], first=first) as connection, pytest.raises(ConnectionClosed):
        connection.recv(timeout=10)


@pytest.mark.parametrize("wrong", [
    '{"do":"hear","lane":0}', '{"do":"hear","lane":17}', '{"do":"hear","lane":"1"}', '{"do":"hear","lane":1,"more":2}',
    '{"do":"changeover","by":"jump"}', '{"do":"monitor","steps":20}', '{"do":"source","what":"/etc/passwd"}',
    '{"do":"exec"}', "[]", "{", '"' + "x" * LONGEST + '"',
])
def test_what_is_no_message_ends_the_visit(wrong: str, running: tuple[Page, Host]) -> None:
    with visit(running[0]) as connection:
        connection.send(wrong)
        with pytest.raises(ConnectionClosed):
            connection.recv(timeout=10)


def test_bytes_are_no_message(running: tuple[Page, Host]) -> None:
    with visit(running[0]) as connection:
        connection.send(b'{"do":"back"}')
        with pytest.raises(ConnectionClosed):
            connection.recv(timeout=10)


def test_a_flood_is_cut_off_and_the_host_goes_on(running: tuple[Page, Host]) -> None:
    page, host = running
    with visit(page) as connection, pytest.raises(ConnectionClosed):
        for _ in range(100_000):
            connection.send('{"do":"back"}')
    before = host.frames
    assert until(lambda: host.frames > before)
    with visit(page) as connection:
        assert picture(connection)["lanes"]


def test_an_allowance_is_what_it_says() -> None:
    now = [0.0]
    allowance = Allowance(lambda: now[0])
    assert sum(not allowance.is_spent() for _ in range(1000)) == AT_ONCE
    now[0] = 1000.0 / A_SECOND + 1.0
    assert not allowance.is_spent()


def test_a_page_that_does_not_ask_is_sent_nothing_and_then_the_latest(running: tuple[Page, Host]) -> None:
    page, host = running
    with visit(page) as connection:
        picture(connection)
        with pytest.raises(TimeoutError):
            connection.recv(timeout=0.3)
        done = host.shared.meters["callbacks"][0]
        blocks = picture(connection)["blocks"]
        assert isinstance(blocks, dict)
        assert blocks["blocks"] >= done - 0.5 * RATE / BLOCK


def test_keys_reach_the_host(running: tuple[Page, Host]) -> None:
    page, host = running
    with visit(page) as connection:
        ask(connection, do="rise")
        assert until(lambda: page.sitting.said in ("coming up", "sounding"))
        ask(connection, do="changeover", by="warm")
        ask(connection, do="hear", lane=2)
        assert until(lambda: host.heard == 1)
        assert host.plan.changed[-1].changeover == "warm"
        ask(connection, do="hear", lane=9)
        assert until(lambda: page.sitting.notice == "There is no lane 9.")
        ask(connection, do="monitor", steps=-1)
        ask(connection, do="back")
        assert until(lambda: host.heard == 0)
        assert page.sitting.monitor_db == -1.0
        ask(connection, do="mute")
        assert until(lambda: page.sitting.said == "muted")


def test_the_noise_that_is_shown_is_what_the_lane_adds(running: tuple[Page, Host]) -> None:
    """White noise at -20 dBFS peak: the white model holds. Some 9,000 frames of a spectrum that is wide: well within 1 dB."""
    page, host = running
    assert until(lambda: host.frames > FRAMES + BLOCK)
    wanted = predicted_noise(host.lanes[0].realization.program, RATE).full_dbfs

    def shown() -> bool:
        lane = picture(connection)["lanes"][0]  # type: ignore[index]
        return lane["predicted"] == round(wanted, 1) and abs(lane["noise"] - wanted) < 1.0

    with visit(page) as connection:
        assert until(shown, 5.0)


@pytest.mark.parametrize(("format", "double"), [(Fixed("Q1.15"), False), ("float32", False), ("float64", True)])
def test_what_a_lane_adds_is_the_difference_that_is_heard(format: Fixed | str, double: bool) -> None:
    """The ring beside the lane against what the mixer sends when the ideal is subtracted: the same operations, to the bit."""
    lane = Lane(realize(SECTIONS, form="direct-1", format=format), 2, ideal=True)
    host = Host([lane], 100, device=Device(2, 2), recent=512)
    host.plan.subtract("ideal")
    x = np.random.default_rng(5).uniform(-0.3, 0.3, (700, 2))
    for start in range(0, 700, 100):
        host.step(x[start : start + 100], np.zeros((100, 2)))
    assert lane.ideal is not None and lane.ideal.double == double
    assert np.array_equal(host.shared.added[0], host.shared.sent)
    assert np.abs(host.shared.added[0]).max() > 0.0


def test_a_sine_reads_its_level_and_prediction_the_level_of_its_noise() -> None:
    k = np.arange(FRAMES)
    assert spectrum(0.5 * np.sin(2 * np.pi * 64 / POINTS * k))[64] == pytest.approx(20 * np.log10(0.5), abs=1e-9)
    theory = Theory(realize(Filter.from_coefficients([0.7], rate=RATE), format=Fixed("Q1.15")))
    white = np.sqrt(2.0**-30 / 12) * np.random.default_rng(3).standard_normal(FRAMES)
    # a mean of 8 pieces over 1025 bins scatters by far less than 0.3 dB; one rounding of half a step each way is 2^-30 / 12
    measured = 10 * np.log10((10 ** (spectrum(white) / 10)).mean())
    assert [level for _, level in theory.third_octaves] == pytest.approx([measured] * 31, abs=0.3)


@pytest.mark.skipif(browser() is None and "CI" not in os.environ, reason="there is no chromium here")
def test_a_browser_shows_the_ledger_and_its_keys_act(running: tuple[Page, Host], tmp_path: Path) -> None:
    from playwright.sync_api import expect, sync_playwright

    page, host = running
    problems: list[str] = []
    flags = ["--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run", "--disable-background-networking",
             "--disable-component-update", "--disable-sync", "--disable-dev-shm-usage", "--mute-audio"]
    with sync_playwright() as driver, driver.chromium.launch(executable_path=browser(), args=flags) as chromium:
        shown = chromium.new_page(viewport={"width": 1280, "height": 720})
        shown.on("console", lambda message: problems.append(message.text))
        shown.on("pageerror", lambda error: problems.append(str(error)))
        requests: list[str] = []
        shown.on("request", lambda request: requests.append(request.url))
        shown.goto(page.address)
        shown.get_by_role("button", name="Volume is down: begin, muted").click()
        shown.wait_for_selector("tr.heard")
        assert shown.locator("tbody tr").count() == 2
        shown.keyboard.press("2")
        assert until(lambda: host.heard == 1)
        expect(shown.locator("tr.heard td").first).to_have_text("2")
        expect(shown.locator("#caption-2")).to_contain_text("Last change, 1 to 2")
        expect(shown.locator("#announced")).to_contain_text("Lane 2")
        shown.wait_for_selector("#diagram svg")
        shown.keyboard.press("u")
        assert until(lambda: page.sitting.said in ("coming up", "sounding"))
        shown.locator(".word[data-word=source] button").first.focus()
        shown.keyboard.press(" ")
        assert until(lambda: page.sitting.said == "muted")
        assert not shown.locator(".word ul").count()
        assert shown.evaluate("[document.documentElement.scrollWidth, document.documentElement.scrollHeight]") == [1280, 720]
        shown.keyboard.press("t")
        for look in ("light", "dark"):
            assert shown.evaluate("document.documentElement.dataset.look") == look
            shown.screenshot(path=tmp_path / f"{look}.png")
            shown.keyboard.press("t")
    assert problems == []
    assert all(address.startswith((f"http://127.0.0.1:{page.port}/", "data:")) for address in requests)
