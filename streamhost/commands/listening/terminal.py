"""The terminal as control: the ledger, written again four times a second, and keys."""

import contextlib
import os
import select
import shutil
import sys
import time
from collections.abc import Callable, Iterator
from typing import TYPE_CHECKING

from streamhost.commands.listening.asked import Prepared
from streamhost.commands.listening.sheet import sheet
from streamhost.commands.listening.watched import follow

if TYPE_CHECKING:
    from streamhost.live.controls import Controls
    from streamhost.live.files import Files

DRAW_S = 0.25
POLL_S = 0.03
QUIT = ("q", "\x03", "\x04")
HIDE, SHOW, HOME, END_LINE, END_ALL = "\x1b[?25l", "\x1b[?25h", "\x1b[H", "\x1b[K", "\x1b[J"
OTHER_PAGE, FORMER_PAGE = "\x1b[?1049h", "\x1b[?1049l"


def attend(ready: Prepared, controls: "Controls", files: "Files") -> None:
    """Until the user quits; Ctrl-C is as good a way as any."""
    keys, drawn = False, 0.0
    controls.notice = "Muted: u lets the output come up."
    with contextlib.suppress(KeyboardInterrupt), _keyboard(), _page():
        while True:
            controls.tend()
            follow(files, ready, controls)
            for key in _pressed():
                if key in QUIT:
                    return
                keys = not keys if key == "?" else keys
                press(controls, key)
                drawn = 0.0
            if time.monotonic() - drawn > DRAW_S:
                _draw(sheet(ready, controls, keys=keys))
                drawn = time.monotonic()


def press(controls: "Controls", key: str) -> None:
    """What a key does; one without a meaning does nothing."""
    if key in "0123456789" and len(key) == 1:
        controls.hear((int(key) - 1) % 10)
        return
    actions: dict[str, Callable[[], None]] = {
        " ": controls.mute, "u": controls.come_up, "b": controls.back, "h": controls.next_changeover,
        "d": controls.difference, "D": controls.other_reference,
        "<": lambda: controls.raised(-1), ">": lambda: controls.raised(1),
        "+": lambda: controls.louder(1), "-": lambda: controls.louder(-1),
    }
    if key in actions:
        actions[key]()


def _pressed() -> Iterator[str]:
    """The keys of the next moment; nobody at the keyboard any more counts as leaving."""
    if not select.select([sys.stdin], [], [], POLL_S)[0]:
        return
    data = os.read(sys.stdin.fileno(), 64)
    if not data:
        yield QUIT[0]
    text = data.decode(errors="ignore")
    if not text.startswith("\x1b"):  # arrows and the like
        yield from text


@contextlib.contextmanager
def _keyboard() -> Iterator[None]:
    """Keys come one by one and are not echoed; Ctrl-C stays a signal."""
    import termios
    import tty

    handle = sys.stdin.fileno()
    former = termios.tcgetattr(handle)
    tty.setcbreak(handle)
    try:
        yield
    finally:
        with contextlib.suppress(termios.error, OSError):  # the terminal may be closed
            termios.tcsetattr(handle, termios.TCSADRAIN, former)


@contextlib.contextmanager
def _page() -> Iterator[None]:
    """The terminal's other page, so that what stood on it comes back."""
    sys.stdout.write(OTHER_PAGE + HIDE)
    try:
        yield
    finally:
        with contextlib.suppress(OSError, ValueError):
            sys.stdout.write(SHOW + FORMER_PAGE)
            sys.stdout.flush()


def _draw(text: str) -> None:
    columns, rows = shutil.get_terminal_size()
    lines = [line if line.startswith("Output") else line[: columns - 1] for line in text.splitlines()][: rows - 1]
    sys.stdout.write(HOME + "".join(f"{line}{END_LINE}\n" for line in lines) + END_ALL)
    sys.stdout.flush()
