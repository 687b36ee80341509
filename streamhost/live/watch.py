"""The watch over an engine and its card: what has gone, stands still or does not answer is noticed, left and looked for.

Nothing here waits on the card: `tend`, called some twenty times a second, does what is due and returns.
"""

import time
from collections.abc import Callable
from dataclasses import dataclass
from enum import Enum
from typing import Any, Protocol

from streamhost.errors import MachineError, RequestError
from streamhost.live.portaudio import Opened, Wanted

STALL_S = 0.25
STALL_LATENCIES = 10
"""A callback is missed when it has not come for STALL_S or so many latencies, whichever is longer."""

READY_S = 60.0
OPEN_S = 4.0
CLOSE_S = 1.5
END_S = 1.0
RETRY_S = 0.5
MOST_CRASHES = 3
PAUSE_S = 0.01


class Worker(Protocol):
    """An engine process; see `Process`."""

    def send(self, message: object) -> None: ...

    def reports(self) -> list[tuple[Any, ...]]: ...

    @property
    def is_alive(self) -> bool: ...

    def kill(self) -> None: ...

    def last_words(self) -> str: ...


class State(Enum):
    """Where engine and card stand."""

    STARTING = "the engine starts"
    OPENING = "the card is being opened"
    PLAYING = "the card plays"
    CLOSING = "the card is being left"
    WAITING = "the card is looked for"
    ENDING = "the engine ends"
    ENDED = "ended"


@dataclass
class Loss:
    """The card was lost at `frame`; `seconds` until it played again, None as long as it does not."""

    frame: int
    reason: str
    seconds: float | None = None


class Watch:
    """`start` makes an engine. callbacks, frame: what the step has counted. lost, ready, opened: told when that happens."""

    def __init__(
        self, start: Callable[[], Worker], wanted: Wanted, callbacks: Callable[[], int], frame: Callable[[], int], *,
        lost: Callable[[], None], ready: Callable[[], None], opened: Callable[[], None],
        clock: Callable[[], float] = time.monotonic,
    ) -> None:
        self.wanted, self.losses, self.notices = wanted, list[Loss](), list[str]()
        self.opened: Opened | None = None
        self.hashes: list[str] = []
        self._start, self._callbacks, self._frame, self._clock = start, callbacks, frame, clock
        self._lost, self._ready, self._opened = lost, ready, opened
        self._crashes, self._lost_at, self._opened_at, self._progress_at, self._tended_at, self._seen = 0, 0.0, 0.0, 0.0, 0.0, 0
        self._begin_engine()

    def send(self, message: object) -> None:
        self._worker.send(message)

    def tend(self) -> list[tuple[Any, ...]]:
        """Do what is due; the reports that are not about engine or card."""
        others = []
        for report in self._worker.reports():
            handler = _REPORTS.get(report[0])
            if handler is None:
                others.append(report)
            else:
                handler(self, *report[1:])
        if self.state not in (State.ENDING, State.ENDED) and not self._worker.is_alive:
            self._crashed()
        _DUE[self.state](self)
        return others

    def leave(self, reason: str) -> None:
        """Give up the card as it is and look for the one that is wanted."""
        self._note(reason)
        self._worker.send(("close",))
        self._enter(State.CLOSING, CLOSE_S)

    def end(self) -> None:
        """What is on its way is heard, if the card lets it; then the engine has ended, whatever it takes."""
        if self.state is State.PLAYING:
            self._worker.send(("end",))
            self._enter(State.ENDING, END_S + (self.opened.latency_s if self.opened else 0.0))
            self._wait_for_the_end()
        self.kill()

    def _wait_for_the_end(self) -> None:
        while self.state is not State.ENDED:
            self.tend()
            time.sleep(PAUSE_S)

    def kill(self) -> None:
        """End the engine, whatever it is doing."""
        self.state = State.ENDED
        self._worker.kill()

    @property
    def is_lost(self) -> bool:
        return bool(self.losses) and self.losses[-1].seconds is None

    @property
    def stall_s(self) -> float:
        """For how long no callback may be missed."""
        return max(STALL_S, STALL_LATENCIES * (self.opened.latency_s if self.opened else 0.0))

    def _enter(self, state: State, seconds: float) -> None:
        self.state, self._due = state, self._clock() + seconds

    def _begin_engine(self) -> None:
        self._worker = self._start()
        self._enter(State.STARTING, READY_S)

    def _start_again(self) -> None:
        self._worker.kill()
        self._begin_engine()

    def _open(self) -> None:
        self._worker.send(("open", self.wanted))
        self._enter(State.OPENING, OPEN_S)

    def _note(self, reason: str) -> None:
        if not self.is_lost:
            self._lost_at = self._clock()
            self.losses.append(Loss(self._frame(), reason))
            self.notices.append(f"The sound card {reason}: looking for it.")
            self._lost()

    def _crashed(self) -> None:
        self._crashes += 1
        if self._crashes >= MOST_CRASHES or self.opened is None:
            raise MachineError(f"The audio engine has ended by itself. Its last words: {self._worker.last_words() or 'none'}")
        self._note("was lost with its engine")
        self._start_again()

    # what the engine tells

    def _on_ready(self) -> None:
        self._ready()
        self._open()

    def _on_opened(self, opened: Opened) -> None:
        self.opened, self.state = opened, State.PLAYING
        self._opened_at = self._progress_at = self._tended_at = self._clock()
        self._seen = self._callbacks()
        self._opened()

    def _on_refused(self, text: str) -> None:
        if self.opened is None:
            raise MachineError(text)
        self._enter(State.WAITING, RETRY_S)

    def _on_unfit(self, text: str) -> None:
        raise RequestError(text)

    def _on_gone(self) -> None:
        self._note("has gone")
        self._enter(State.WAITING, RETRY_S)

    def _on_closed(self) -> None:
        if self.state is State.CLOSING:
            self._enter(State.WAITING, 0.0)

    def _on_ended(self, hashes: list[str]) -> None:
        self.hashes, self.state = hashes, State.ENDED

    # what is due

    def _is_due(self) -> bool:
        return self._clock() >= self._due

    def _while_starting(self) -> None:
        if self._is_due():
            raise MachineError(f"The audio engine did not start. Its last words: {self._worker.last_words() or 'none'}")

    def _while_opening(self) -> None:
        if self._is_due():
            if self.opened is None:
                raise MachineError("The sound card does not answer. --no-device runs without one.")
            self._start_again()

    def _while_playing(self) -> None:
        now, callbacks = self._clock(), self._callbacks()
        held_up = now - self._tended_at > self.stall_s / 2.0  # we ourselves, and perhaps all the machine
        self._tended_at = now
        if callbacks != self._seen or held_up:
            self._seen, self._progress_at = callbacks, now
        if held_up:
            self._opened_at = now
        if now - self._progress_at > self.stall_s:
            self.leave("stands still")
        elif self.is_lost and self._progress_at - self._opened_at > self.stall_s:
            self._found(now)

    def _found(self, now: float) -> None:
        loss = self.losses[-1]
        loss.seconds, self._crashes = now - self._lost_at, 0
        self.notices.append(f"The sound card is back after {loss.seconds:.1f} s.")

    def _while_closing(self) -> None:
        if self._is_due():
            self._start_again()

    def _while_ending(self) -> None:
        if self._is_due():
            self.state = State.ENDED

    def _while_waiting(self) -> None:
        if self._is_due():
            self._open()


_REPORTS: dict[str, Callable[..., None]] = {
    "ready": Watch._on_ready, "opened": Watch._on_opened, "refused": Watch._on_refused, "unfit": Watch._on_unfit,
    "gone": Watch._on_gone, "closed": Watch._on_closed, "ended": Watch._on_ended,
}
_DUE: dict[State, Callable[[Watch], None]] = {
    State.STARTING: Watch._while_starting, State.OPENING: Watch._while_opening, State.PLAYING: Watch._while_playing,
    State.CLOSING: Watch._while_closing, State.WAITING: Watch._while_waiting, State.ENDING: Watch._while_ending,
    State.ENDED: lambda watch: None,
}
