"""What is heard and how, as keys change it, whoever drives the host; and what is said before the first sound."""

import pytest

from streamhost.host.guard import CAUTION
from streamhost.host.hearing import LOWEST_DB, MOST_RAISED_DB, Hearing


class Listener(Hearing):
    """Of three lanes, the last of which cannot be heard; `sent` is what the host was asked for."""

    lane_count = 3  # type: ignore[assignment]

    def __init__(self) -> None:
        super().__init__()
        self.sent: list[object] = []

    def _change_to(self, lane: int) -> bool:
        self.sent.append(lane)
        return lane != 2

    def _send_difference(self, reference: int | str | None) -> bool:
        self.sent.append((reference, self.raise_db))
        return True

    def _send_monitor(self) -> None:
        self.sent.append(self.monitor_db)


def test_a_change_is_made_once_and_undone_by_the_lane_before() -> None:
    listener = Listener()
    listener.hear(1)
    listener.hear(1)
    assert (listener.sent, listener.chosen, listener.before) == ([1], 1, 0)
    listener.back()
    assert (listener.sent, listener.chosen, listener.before) == ([1, 0], 0, 1)


def test_what_the_host_refuses_and_what_is_not_there_change_nothing() -> None:
    listener = Listener()
    for lane in (2, 3, -1):
        listener.hear(lane)
    assert (listener.sent, listener.chosen) == ([2], 0)
    assert listener.notice == "There is no lane 0."


def test_a_difference_from_the_lane_before_follows_a_change() -> None:
    listener = Listener()
    listener.hear(1)
    listener.difference()
    listener.other_reference()
    listener.raised(1)
    listener.hear(0)
    assert listener.sent == [1, ("ideal", 0.0), (0, 0.0), (0, 6.0), 0, (1, 6.0)]
    assert listener.notice == "You hear the difference from lane 2, raised by 6 dB."


def test_levels_stay_within_their_ends() -> None:
    listener = Listener()
    listener.louder(3)
    assert listener.monitor_db == 0.0
    listener.louder(-1000)
    assert listener.monitor_db == LOWEST_DB
    listener.raised(-1)
    assert listener.raise_db == 0.0
    listener.raised(1000)
    assert listener.raise_db == MOST_RAISED_DB


def test_changeovers_come_in_turn() -> None:
    listener = Listener()
    seen = []
    for _ in range(5):
        listener.next_changeover()
        seen.append(listener.changeover)
    assert seen == ["warm", "fade", "keep", "cold", "carry"]


@pytest.mark.parametrize("said", [
    "Turn the volume down", "headphones off the first time", "full scale", "no protective device and no medical device",
    "local codes and licensed practice rule",
])
def test_the_caution_says_what_it_must(said: str) -> None:
    assert said in CAUTION
