"""The watch over engine and card, with an engine and a clock of the test's own: nothing is waited for."""

from typing import Any

import pytest

from streamhost.errors import MachineError, RequestError
from streamhost.live.portaudio import Opened, Wanted
from streamhost.live.watch import CLOSE_S, MOST_CRASHES, OPEN_S, READY_S, RETRY_S, STALL_S, State, Watch

TICK = 0.05
OPENED = Opened("vsink", "", 0.024, "compiled")


class FakeWorker:
    def __init__(self) -> None:
        self.sent: list[Any] = []
        self.told: list[tuple[Any, ...]] = []
        self.is_alive, self.is_killed = True, False

    def send(self, message: object) -> None:
        self.sent.append(message)

    def reports(self) -> list[tuple[Any, ...]]:
        told, self.told = self.told, []
        return told

    def kill(self) -> None:
        self.is_alive, self.is_killed = False, True

    def last_words(self) -> str:
        return "segmentation fault"


class Run:
    """A watch whose time passes by `pass_time`, 50 ms at a time, with callbacks or without."""

    def __init__(self) -> None:
        self.now, self.callbacks = 100.0, 0
        self.workers: list[FakeWorker] = []
        self.calls: list[str] = []
        self.watch = Watch(self._start, Wanted(48000.0, 128, 2), lambda: self.callbacks, lambda: 128 * self.callbacks,
                           lost=lambda: self.calls.append("lost"), ready=lambda: self.calls.append("ready"),
                           opened=lambda: self.calls.append("opened"), clock=lambda: self.now)

    def _start(self) -> FakeWorker:
        self.workers.append(FakeWorker())
        return self.workers[-1]

    @property
    def worker(self) -> FakeWorker:
        return self.workers[-1]

    def tell(self, *report: Any) -> None:
        self.worker.told.append(report)
        self.watch.tend()

    def pass_time(self, seconds: float, *, playing: bool = False) -> None:
        for _ in range(round(seconds / TICK)):
            self.now += TICK
            self.callbacks += playing
            self.watch.tend()

    def play(self) -> None:
        self.tell("ready")
        self.tell("opened", OPENED)
        self.pass_time(1.0, playing=True)


def test_a_card_that_plays_is_left_alone() -> None:
    run = Run()
    assert run.watch.state is State.STARTING
    run.play()
    run.pass_time(20.0, playing=True)
    assert run.watch.state is State.PLAYING
    assert run.worker.sent == [("open", run.watch.wanted)]
    assert (run.watch.losses, run.calls) == ([], ["ready", "opened"])


def test_a_card_that_has_gone_is_opened_again_until_it_plays() -> None:
    run = Run()
    run.play()
    run.tell("gone")
    assert run.watch.is_lost
    for _ in range(3):
        run.pass_time(RETRY_S + TICK)
        assert run.worker.sent[-1] == ("open", run.watch.wanted)
        run.tell("refused", "no such device")
    run.pass_time(RETRY_S + TICK)
    run.tell("opened", OPENED)
    assert run.watch.is_lost  # it has not played yet
    run.pass_time(0.5, playing=True)
    assert not run.watch.is_lost
    (loss,) = run.watch.losses
    assert (loss.frame, loss.reason) == (128 * 20, "has gone")
    assert loss.seconds == pytest.approx(4 * (RETRY_S + TICK) + 0.3, abs=0.11)
    assert len(run.workers) == 1
    assert run.calls == ["ready", "opened", "lost", "opened"]


@pytest.mark.parametrize("answers", [True, False])
def test_a_card_that_stands_still_is_left_and_a_stuck_engine_is_killed(answers: bool) -> None:
    run = Run()
    run.play()
    run.pass_time(STALL_S + 2 * TICK)
    assert (run.watch.state, run.worker.sent[-1]) == (State.CLOSING, ("close",))
    if answers:
        run.tell("closed")
        run.pass_time(TICK)
        assert (len(run.workers), run.worker.sent[-1]) == (1, ("open", run.watch.wanted))
        return
    run.pass_time(CLOSE_S + TICK)
    assert run.workers[0].is_killed
    assert len(run.workers) == 2
    run.tell("ready")
    run.pass_time(OPEN_S + TICK)  # and it hangs again, in opening
    assert run.workers[1].is_killed
    run.tell("ready")
    run.tell("opened", OPENED)
    run.pass_time(0.5, playing=True)
    assert not run.watch.is_lost
    assert len(run.watch.losses) == 1


def test_a_few_callbacks_after_opening_are_no_return() -> None:
    """As of a suspended sink, which takes what its buffer holds."""
    run = Run()
    run.play()
    run.tell("gone")
    run.pass_time(RETRY_S + TICK)
    run.tell("opened", OPENED)
    run.pass_time(3 * TICK, playing=True)
    run.pass_time(STALL_S + 2 * TICK)
    assert run.watch.is_lost
    assert run.watch.state is State.CLOSING


def test_being_held_up_oneself_is_no_loss() -> None:
    run = Run()
    run.play()
    run.now += 30.0  # the machine slept, callbacks did too
    run.watch.tend()
    assert run.watch.state is State.PLAYING
    run.pass_time(2.0, playing=True)
    assert run.watch.losses == []


def test_a_long_latency_has_patience() -> None:
    run = Run()
    run.tell("ready")
    run.tell("opened", Opened("far", "", 0.2, "compiled"))
    run.pass_time(1.9)
    assert run.watch.losses == []
    run.pass_time(0.3)
    assert run.watch.is_lost


def test_an_engine_that_crashes_is_started_again_but_not_for_ever() -> None:
    run = Run()
    run.play()
    for _ in range(MOST_CRASHES - 1):
        run.worker.is_alive = False
        run.watch.tend()
        assert run.worker.is_alive
    run.worker.is_alive = False
    with pytest.raises(MachineError, match="segmentation fault"):
        run.watch.tend()


def test_what_cannot_begin_says_so() -> None:
    run = Run()
    run.tell("ready")
    with pytest.raises(MachineError, match="no such device"):
        run.tell("refused", "no such device")
    with pytest.raises(RequestError, match="two rates"):
        Run().tell("unfit", "two rates")
    for seconds, ready in ((READY_S, False), (OPEN_S, True)):
        run = Run()
        if ready:
            run.tell("ready")
        with pytest.raises(MachineError, match=r"did not start|does not answer"):
            run.pass_time(seconds + 2 * TICK)
    run = Run()
    run.worker.is_alive = False
    with pytest.raises(MachineError, match="ended by itself"):
        run.watch.tend()


def test_another_card_is_opened_when_it_is_chosen() -> None:
    run = Run()
    run.play()
    other = Wanted(48000.0, 64, 2, device="other")
    run.watch.wanted = other
    run.watch.leave("was given up for another")
    run.tell("closed")
    run.pass_time(TICK)
    assert run.worker.sent[-2:] == [("close",), ("open", other)]


def test_reports_that_are_not_of_the_card_are_passed_on() -> None:
    run = Run()
    run.play()
    run.worker.told = [("done", 1), ("failed", 2, "no")]
    assert run.watch.tend() == [("done", 1), ("failed", 2, "no")]
