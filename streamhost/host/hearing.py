"""What is heard of a host and how, as keys and words change it: the same rules, steps and sentences whoever drives the host."""

from abc import ABC, abstractmethod

from streamhost.host.records import CHANGEOVERS

RAISE_STEP_DB = 6.0
MOST_RAISED_DB = 120.0
MONITOR_STEP_DB = 1.0
LOWEST_DB = -60.0


class Hearing(ABC):
    """The settings of one listener, each changed by a method; `notice` says what came of the last.

    Lanes are counted from 0. chosen: the lane that is heard when all that was asked for is done; before: the one before it.
    against: what the difference is from, "ideal" or "before"; differs: whether it is heard, and not the lane itself.
    """

    def __init__(self, chosen: int = 0, changeover: str = "carry", monitor_db: float = 0.0) -> None:
        self.chosen, self.before = chosen, 0
        self.changeover, self.monitor_db = changeover, monitor_db
        self.raise_db, self.against, self.differs = 0.0, "ideal", False
        self.notice = ""

    @property
    @abstractmethod
    def lane_count(self) -> int: ...

    @abstractmethod
    def _change_to(self, lane: int) -> bool:
        """Ask the host for a lane by `changeover`; False, with a notice, where it cannot be."""

    @abstractmethod
    def _send_difference(self, reference: int | str | None) -> bool:
        """Have the host subtract "ideal", a lane, or nothing, raised by `raise_db`; False, with a notice, where it cannot."""

    @abstractmethod
    def _send_monitor(self) -> None:
        """Have the host take `monitor_db`."""

    def hear(self, lane: int) -> None:
        """Change to a lane by the changeover that is chosen."""
        if not 0 <= lane < self.lane_count:
            self.notice = f"There is no lane {lane + 1}."
            return
        if lane != self.chosen and self._change_to(lane):
            self.before, self.chosen = self.chosen, lane
            self.notice = f"Lane {lane + 1}, by {self.changeover}."
            if self.differs and self.against == "before":
                self._subtract()

    def back(self) -> None:
        """The lane before."""
        self.hear(self.before)

    def take_over_by(self, changeover: str) -> None:
        """Of changes from now on."""
        assert changeover in CHANGEOVERS, "it was checked at the door"
        self.changeover = changeover
        self.notice = f"A change takes over by {changeover}."

    def next_changeover(self) -> None:
        self.take_over_by(CHANGEOVERS[(CHANGEOVERS.index(self.changeover) + 1) % len(CHANGEOVERS)])

    def difference(self) -> None:
        """Hear the difference, or the lane itself."""
        self.differs = not self.differs
        self._subtract()

    def other_reference(self) -> None:
        """The difference from exact arithmetic or from the lane before."""
        self.against = "before" if self.against == "ideal" else "ideal"
        self._subtract()

    def raised(self, steps: int) -> None:
        """The difference by 6 dB a step."""
        self.raise_db = min(max(self.raise_db + steps * RAISE_STEP_DB, 0.0), MOST_RAISED_DB)
        self._subtract()

    def louder(self, steps: int) -> None:
        """The monitor by 1 dB a step, at most 0 dB."""
        self.monitor_db = min(max(self.monitor_db + steps * MONITOR_STEP_DB, LOWEST_DB), 0.0)
        self._send_monitor()
        self.notice = f"The monitor is at {self.monitor_db:g} dB."

    @property
    def subtracted(self) -> int | str | None:
        """What is subtracted from what is heard: "ideal", a lane, or nothing."""
        if not self.differs:
            return None
        return "ideal" if self.against == "ideal" else self.before

    def _subtract(self) -> None:
        if self._send_difference(self.subtracted):
            named = "exact arithmetic" if self.against == "ideal" else f"lane {self.before + 1}"
            self.notice = (f"You hear the difference from {named}, raised by {self.raise_db:g} dB." if self.differs
                           else "You hear the lane itself, and no difference.")
