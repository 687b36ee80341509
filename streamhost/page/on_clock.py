"""A sitting at a host that a clock drives in this process."""

from collections.abc import Callable, Sequence

from streamhost.errors import RequestError
from streamhost.host import Host
from streamhost.host.lane import Lane
from streamhost.host.plan import Change
from streamhost.host.records import CHANGEOVERS, STATES
from streamhost.host.shared import Shared
from streamhost.host.sources import generated
from streamhost.page.sitting import LOWEST_DB, MONITOR_STEP_DB, MOST_RAISED_DB, RAISE_STEP_DB

LATER = ("act", "carry", "generate", "ideal", "mix")
"""Parts of the step that a key may need: compiled before the run, so that none has to wait."""

NOW = 0


class ClockSitting:
    """Its methods are called between two blocks; see `Sitting`."""

    def __init__(self, host: Host, titles: Sequence[str], monitor_db: float = 0.0) -> None:
        self._host = host
        self.titles, self.monitor_db = titles, monitor_db
        self.changeover, self.raise_db, self.differs, self.against = "carry", 0.0, False, "ideal"
        self.before, self._wanted = 0, host.plan.heard_at(NOW)
        self.notice = "On the clock, muted: u lets the output come up."
        for part in LATER:
            host.need(part)

    @property
    def lanes(self) -> Sequence[Lane]:
        return self._host.lanes

    @property
    def shared(self) -> Shared:
        return self._host.shared

    @property
    def rate(self) -> float:
        return self._host.rate

    @property
    def block(self) -> int:
        return self._host.block

    @property
    def begins(self) -> int:
        return self._host.begins

    @property
    def heard(self) -> int:
        return int(self.shared.meters["heard_lane"][0])

    @property
    def said(self) -> str:
        return STATES[int(self.shared.meters["state"][0])]

    @property
    def source_said(self) -> str:
        return self._host.source.said

    @property
    def place_said(self) -> str:
        return "the clock"

    def hear(self, lane: int) -> None:
        """Change to a lane by the changeover that is chosen."""
        if not 0 <= lane < len(self.lanes):
            self.notice = f"There is no lane {lane + 1}."
            return
        if lane == self._wanted:
            return
        if self._do(lambda: self._host.plan.change(Change(NOW, lane, self.changeover))):
            self.before, self._wanted = self._wanted, lane
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

    def difference(self) -> None:
        """Hear the difference, or what is heard itself."""
        self.differs = not self.differs
        self._subtract()

    def other_reference(self) -> None:
        """The difference against exact or against the lane before."""
        self.against = "before" if self.against == "ideal" else "ideal"
        self._subtract()

    def raised(self, steps: int) -> None:
        """The difference by 6 dB a step."""
        self.raise_db = min(max(self.raise_db + steps * RAISE_STEP_DB, 0.0), MOST_RAISED_DB)
        self._subtract()

    def louder(self, steps: int) -> None:
        """The monitor by 1 dB a step, at most 0 dB."""
        self.monitor_db = min(max(self.monitor_db + steps * MONITOR_STEP_DB, LOWEST_DB), 0.0)
        self._host.set_monitor(self.monitor_db)
        self.notice = f"The monitor is at {self.monitor_db:g} dB."

    def take(self, source: str) -> None:
        """Another generated signal."""
        host = self._host
        if self._do(lambda: host.plan.take(generated(source, host.rate, host.channels))):
            self.notice = f"What comes in is {source}."

    def mute(self) -> None:
        self._host.mute()
        self.notice = "Muted."

    def come_up(self) -> None:
        self._host.come_up()
        self.notice = "Coming up."

    def tend(self) -> None:
        """To be called now and then in long runs."""
        self._host.plan.tend()

    def _subtract(self) -> None:
        what = None if not self.differs else "ideal" if self.against == "ideal" else self.before
        if self._do(lambda: self._host.plan.subtract(what, self.raise_db)):
            named = "exact arithmetic" if self.against == "ideal" else f"lane {self.before + 1}"
            self.notice = (f"You hear the difference from {named}, raised by {self.raise_db:g} dB." if self.differs
                           else "You hear the lane itself, and no difference.")

    def _do(self, act: Callable[[], object]) -> bool:
        try:
            act()
        except RequestError as problem:
            self.notice = str(problem)
            return False
        return True
