"""The caution before the first sound: read and acknowledged once, or by an option."""

import contextlib
import hashlib
import os
from pathlib import Path

import click

from streamhost.errors import RequestError


def acknowledge(*, given: bool, attended: bool) -> None:
    """Returns where it has been acknowledged, now or before. RequestError where nobody is there to do so."""
    from streamhost.host.guard import CAUTION

    place, mark = _place(), hashlib.sha256(CAUTION.encode()).hexdigest()
    if given or _is_marked(place, mark):
        return
    if not attended:
        raise RequestError(f"{CAUTION} Where the volume is down, say so by --volume-is-down.")
    click.echo(CAUTION)
    click.prompt("Volume is down: begin, muted? Enter", default="", show_default=False, prompt_suffix="")
    with contextlib.suppress(OSError):  # asked again the next time
        place.parent.mkdir(parents=True, exist_ok=True)
        place.write_text(mark + "\n")


def _is_marked(place: Path, mark: str) -> bool:
    try:
        return place.read_text().strip() == mark
    except (OSError, UnicodeDecodeError):
        return False


def _place() -> Path:
    """As the XDG base directory specification has it."""
    states = Path(os.environ.get("XDG_STATE_HOME", ""))
    base = states if states.is_absolute() else Path.home() / ".local" / "state"
    return base / "streamhost" / "caution"
