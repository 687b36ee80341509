"""A sitting at a host that a clock drives in this process."""

from collections.abc import Callable, Sequence

from streamhost.errors import RequestError
from streamhost.host import Host
from streamhost.host.lane import Lane
from streamhost.host.plan import Change
from streamhost.host.records import STATES
from streamhost.host.shared import Shared
from streamhost.host.sources import generated
from streamhost.page.sitting import Sitting

LATER = ("act", "carry", "generate", "ideal", "mix")
"""Parts of the step that a key may need: compiled before the run, so that none has to wait."""

NOW = 0


class ClockSitting(Sitting):
    """Its methods are called between two blocks; see `Sitting`."""

    def __init__(self, host: Host, titles: Sequence[str], monitor_db: float = 0.0) -> None:
        super().__init__(host.plan.heard_at(NOW), monitor_db=monitor_db)
        self._host, self.titles = host, titles
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

    def _change_to(self, lane: int) -> bool:
        return self._do(lambda: self._host.plan.change(Change(NOW, lane, self.changeover)))

    def _send_difference(self, reference: int | str | None) -> bool:
        return self._do(lambda: self._host.plan.subtract(reference, self.raise_db))

    def _send_monitor(self) -> None:
        self._host.set_monitor(self.monitor_db)

    def _do(self, act: Callable[[], object]) -> bool:
        try:
            act()
        except RequestError as problem:
            self.notice = str(problem)
            return False
        return True
