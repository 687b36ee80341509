"""A host on a sound card as its user holds it: commanded, watched over, taken up again after a loss, ended."""

import time
from dataclasses import replace
from types import TracebackType
from typing import Self

from streamhost.cache import kernel_folder
from streamhost.errors import MachineError, RequestError
from streamhost.host.records import COMING_UP, SOUNDING, STATES
from streamhost.live.memory import Memory
from streamhost.live.portaudio import Opened, Wanted
from streamhost.live.process import Process
from streamhost.live.recipe import Input, LaneAsked, Planned, Recipe
from streamhost.live.watch import Loss, State, Watch

POLL_S = 0.03
"""Between two calls of `tend`, about."""

LOST = "The engine was started again before this was done."


class Early:
    """An engine that begins to load before it is known what it is to run, and the memory that it shares with its parent."""

    def __enter__(self) -> Self:
        self.memory = Memory()
        self.process: Process | None = Process(self.memory)
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        if self.process is not None:
            self.process.kill()
        self.memory.close()

    def taken(self) -> Process:
        """The engine that has begun, once; after it others."""
        process, self.process = self.process or Process(self.memory), None
        return process


class Card:
    """One recipe on one card. Used as a context: the engine ends with it, whatever happens.

    `tend` must be called all the time. Settings live in memory that outlives an engine; an engine that takes the place of
    another is told the rest.
    """

    def __init__(self, recipe: Recipe, wanted: Wanted, early: Early) -> None:
        self.recipe = recipe
        self._wanted, self._early = wanted, early
        self.shared = recipe.shared(early.memory.mapped(recipe.bytes))
        self._answers: dict[int, str | None] = {}
        self._tickets = 0
        self._gain_db, self._counter, self._was_up = 0.0, -1, False
        self._minus: tuple[int | str | None, float] = (None, 0.0)

    def __enter__(self) -> Self:
        self._watch = Watch(
            self._engine, self._wanted, lambda: int(self.shared.meters["callbacks"][0]), lambda: self.frame,
            lost=self._on_lost, ready=self._on_ready, opened=self._on_opened,
        )
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        try:
            if kind is None:
                self._watch.end()
        finally:
            self._watch.kill()

    def begin(self) -> None:
        """Wait until the card plays, muted. MachineError where it cannot be opened; RequestError for lanes that do not fit."""
        while self._watch.state is not State.PLAYING:
            self.tend()
            time.sleep(POLL_S / 3)

    def tend(self) -> list[str]:
        """Do what is due, without waiting for anything; what there is to be said, each a sentence.

        Raises MachineError where nothing can be done any more.
        """
        for name, ticket, *text in self._watch.tend():
            self._answers[ticket] = text[0] if name == "failed" else ""
        notices, self._watch.notices = self._watch.notices, []
        return notices

    def come_up(self) -> None:
        """Let the output come up by its ramp, from mute and after the guard has shut."""
        self._was_up = True
        self.shared.come_up()

    def mute(self) -> None:
        """Silence at once; it lasts through a loss of the card."""
        self._was_up = False
        self.shared.mute()

    def set_monitor(self, gain_db: float) -> None:
        """The monitor's gain. RequestError above 0 dB."""
        self.shared.set_monitor(gain_db)
        self._gain_db = gain_db

    def count_on(self, channel: int) -> None:
        """On this channel of the card, from 0, a count of frames, k / 2^24, takes the place of sound; -1: on none."""
        self._counter = channel
        self.shared.control["counter_channel"] = channel

    def change(self, planned: Planned) -> int:
        """Plan a change, its frame counted from the beginning; a ticket for `answer`."""
        return self._ask("change", planned)

    def subtract(self, what: int | str | None, raise_db: float = 0.0) -> int:
        """What is heard less another lane or its "ideal", raised; None: less nothing. A ticket."""
        self._minus = (what, raise_db)
        return self._ask("subtract", what, raise_db)

    def place(self, lane: LaneAsked, slot: int | None = None) -> int:
        """Run a lane more, or another one in a slot that is not heard. A ticket."""
        lanes = list(self.recipe.lanes)
        place = len(lanes) if slot is None else slot
        lanes[place : place + 1] = [lane]
        self.recipe = replace(self.recipe, lanes=tuple(lanes))
        return self._ask("place", lane, slot)

    def take(self, given: Input) -> int:
        """Another input. A ticket."""
        self.recipe = replace(self.recipe, input=given)
        return self._ask("take", given)

    def choose(self, wanted: Wanted) -> None:
        """Another card, or the same one otherwise."""
        self._watch.wanted = wanted
        self._watch.leave("was given up for another")

    def answer(self, ticket: int) -> str | None:
        """"" once it was done, why not where it was refused; None before."""
        return self._answers[ticket]

    def wait(self, ticket: int, seconds: float = 2.0) -> list[str]:
        """Until it has been answered; what was to be said meanwhile.

        RequestError where it was refused, MachineError where no answer comes.
        """
        until, notices = time.monotonic() + seconds, list[str]()
        while (answer := self._answers[ticket]) is None:
            if time.monotonic() > until:
                raise MachineError("The audio engine does not answer.")
            notices += self.tend()
            time.sleep(POLL_S / 10)
        if answer:
            raise RequestError(answer)
        return notices

    @property
    def frame(self) -> int:
        """Frames since the beginning, of all engines that have followed each other."""
        return int(self.shared.meters["frame"][0])

    @property
    def heard(self) -> int:
        return int(self.shared.meters["heard_lane"][0])

    @property
    def opened(self) -> Opened:
        """The card as it was last opened."""
        assert self._watch.opened is not None, "it has begun"
        return self._watch.opened

    @property
    def engine(self) -> int:
        """The process that the engine is, or was."""
        return self._pid

    @property
    def is_lost(self) -> bool:
        return self._watch.is_lost

    @property
    def losses(self) -> list[Loss]:
        return self._watch.losses

    @property
    def hashes(self) -> list[str]:
        """Of the lanes' states, once it has ended while it played."""
        return self._watch.hashes

    @property
    def said(self) -> str:
        """The state of the output in words."""
        return "card lost, looking" if self._watch.is_lost else STATES[int(self.shared.meters["state"][0])]

    def _ask(self, name: str, *arguments: object) -> int:
        self._tickets += 1
        self._answers[self._tickets] = None
        self._watch.send((name, self._tickets, *arguments))
        return self._tickets

    def _engine(self) -> Process:
        """An engine, the first or one that goes on where the last one was."""
        self._answers = {ticket: LOST if answer is None else answer for ticket, answer in self._answers.items()}
        process, folder = self._early.taken(), kernel_folder()
        recipe = replace(self.recipe, heard=self.heard or self.recipe.heard, begins=self.frame)
        process.send((None if folder is None else str(folder.parent), recipe))
        self._pid = process.pid
        return process

    def _on_lost(self) -> None:
        self._was_up = int(self.shared.meters["state"][0]) in (COMING_UP, SOUNDING)
        self.shared.mute()

    def _on_ready(self) -> None:
        self.shared.set_monitor(self._gain_db)
        self.count_on(self._counter)
        if self._minus[0] is not None:
            self._ask("subtract", *self._minus)

    def _on_opened(self) -> None:
        if self._was_up:
            self.shared.come_up()
