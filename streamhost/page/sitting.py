"""What the page needs of a running host: what it shows, and what a key does. A clock or a sound card may stand behind it."""

from collections.abc import Sequence
from typing import Protocol

from streamhost.host.lane import Lane
from streamhost.host.shared import Shared

RAISE_STEP_DB = 6.0
MOST_RAISED_DB = 120.0
MONITOR_STEP_DB = 1.0
LOWEST_DB = -60.0


class Sitting(Protocol):
    """One user at one host. What is read may be read by any thread; what acts is called by the one that tends the host.

    `mute` alone may be called by any thread, at any time. Lanes are counted from 0. Nothing here raises for what a user
    asks: what cannot be is told by `notice`.
    """

    titles: Sequence[str]
    changeover: str
    monitor_db: float
    raise_db: float
    differs: bool
    """Whether the difference is sent to the monitor, and not what is heard itself."""
    against: str
    """What it is the difference from: "ideal" or "before"."""
    before: int
    notice: str

    @property
    def lanes(self) -> Sequence[Lane]: ...

    @property
    def shared(self) -> Shared: ...

    @property
    def rate(self) -> float: ...

    @property
    def block(self) -> int: ...

    @property
    def begins(self) -> int:
        """What the step counts the first frame as."""
        ...

    @property
    def heard(self) -> int: ...

    @property
    def said(self) -> str:
        """The state of the output in words."""
        ...

    @property
    def source_said(self) -> str: ...

    @property
    def place_said(self) -> str:
        """Where it sounds: a card's name, or "the clock"."""
        ...

    def hear(self, lane: int) -> None: ...

    def back(self) -> None: ...

    def take_over_by(self, changeover: str) -> None: ...

    def difference(self) -> None: ...

    def other_reference(self) -> None: ...

    def raised(self, steps: int) -> None: ...

    def louder(self, steps: int) -> None: ...

    def take(self, source: str) -> None: ...

    def mute(self) -> None: ...

    def come_up(self) -> None: ...
