"""What the page needs of a running host: what it shows, and what a key does. A clock or a sound card may stand behind it."""

from abc import abstractmethod
from collections.abc import Sequence

from streamhost.host.hearing import Hearing
from streamhost.host.lane import Lane
from streamhost.host.shared import Shared


class Sitting(Hearing):
    """One user at one host. What is read may be read by any thread; what acts is called by the one that tends the host.

    `mute` alone may be called by any thread, at any time. Nothing here raises for what a user asks: what cannot be is told by
    `notice`.
    """

    titles: Sequence[str]

    @property
    @abstractmethod
    def lanes(self) -> Sequence[Lane]: ...

    @property
    @abstractmethod
    def shared(self) -> Shared: ...

    @property
    @abstractmethod
    def rate(self) -> float: ...

    @property
    @abstractmethod
    def block(self) -> int: ...

    @property
    @abstractmethod
    def begins(self) -> int:
        """What the step counts the first frame as."""

    @property
    @abstractmethod
    def heard(self) -> int: ...

    @property
    @abstractmethod
    def said(self) -> str:
        """The state of the output in words."""

    @property
    @abstractmethod
    def source_said(self) -> str: ...

    @property
    @abstractmethod
    def place_said(self) -> str:
        """Where it sounds: a card's name, or "the clock"."""

    @property
    def lane_count(self) -> int:
        return len(self.lanes)

    @abstractmethod
    def take(self, source: str) -> None:
        """Another generated signal."""

    @abstractmethod
    def mute(self) -> None: ...

    @abstractmethod
    def come_up(self) -> None: ...
