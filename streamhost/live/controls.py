"""What an engineer does at a running host, by keys or by words: the same for a terminal and a page."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field

from streamhost.errors import RequestError
from streamhost.host.carrying import prepare_carry
from streamhost.host.lane import Lane
from streamhost.host.plan import Change
from streamhost.host.records import CHANGEOVERS, MOST_LANES
from streamhost.live.card import Card
from streamhost.live.recipe import LaneAsked, Planned
from streamhost.program.carrying import is_run

RAISE_STEP_DB = 6.0
MOST_RAISED_DB = 120.0
MONITOR_STEP_DB = 1.0
LOWEST_DB = -60.0
NOW = 0


def planned(change: Change, before: int, lanes: Sequence[Lane]) -> Planned:
    """The change with the state that it carries, solved here and not in the engine. RequestError where none can be."""
    old, new = lanes[before], lanes[change.lane]
    if change.changeover != "carry" or old is new or is_run(new.realization.program):
        return Planned(change, before)
    return Planned(change, before, prepare_carry(old, new))


def planned_in_order(changes: Sequence[Change], lanes: Sequence[Lane]) -> tuple[Planned, ...]:
    """Changes from lane 0 on, each prepared for the one that is heard before it."""
    found, before = list[Planned](), 0
    for change in sorted(changes, key=lambda change: change.frame):
        found.append(planned(change, before, lanes))
        before = change.lane
    return tuple(found)


def check_fit(lane: Lane, first: Lane) -> None:
    """RequestError where a lane cannot stand beside the first."""
    for what, own, its in (
        ("channels", lane.channels, first.channels), ("rate", lane.realization.rate, first.realization.rate),
        ("outputs", len(lane.realization.outputs), len(first.realization.outputs)),
    ):
        if own != its:
            raise RequestError(f"It has {own:g} as its {what} now, and the lanes that run have {its:g}.")


@dataclass
class Controls:
    """The settings of one card, each changed by a method.

    lanes: the parent's, which never run, by the slot of the host that they stand in. slots: that of each lane, by its number
    from 0; a lane that is built anew takes turns between two. heard: the number of the lane that is heard when all that is
    planned is done.
    """

    card: Card
    lanes: list[Lane]
    heard: int = 0
    changeover: str = "carry"
    monitor_db: float = 0.0
    raise_db: float = 0.0
    against: str = "ideal"
    differs: bool = False
    before: int = 0
    notice: str = ""
    slots: list[int] = field(default_factory=list)
    _owners: list[int] = field(default_factory=list)
    _asked: dict[int, Callable[[], None]] = field(default_factory=dict)

    def __post_init__(self) -> None:
        self.slots, self._owners = list(range(len(self.lanes))), list(range(len(self.lanes)))

    def tend(self) -> None:
        """Watch over the card, and hear what became of changes."""
        for text in self.card.tend():
            self.notice = text
        for ticket in list(self._asked):
            answer = self.card.answer(ticket)
            if answer is None:
                continue
            undo = self._asked.pop(ticket)
            if answer:
                undo()
                self.notice = answer

    def hear(self, lane: int) -> None:
        """Change to a lane, from 0."""
        if not 0 <= lane < len(self.slots):
            self.notice = f"There is no lane {lane + 1}."
            return
        former = self.heard, self.before

        def undo() -> None:
            self.heard, self.before = former

        if lane != self.heard and self._change(self.slots[self.heard], self.slots[lane], self.changeover, undo):
            self.before, self.heard = self.heard, lane
            self.notice = f"Lane {lane + 1}, by {self.changeover}."
            if self.differs and self.against == "before":
                self._subtract()

    def take_up(self, number: int, asked: LaneAsked, lane: Lane) -> None:
        """Run another lane under this number; where it is heard, the change is as any other. RequestError where it does not
        fit."""
        slot = self._spare(number)
        check_fit(lane, self.lanes[0])
        former = self.slots[number]
        self.card.place(asked, slot if slot < len(self.lanes) else None)
        self.lanes[slot : slot + 1], self._owners[slot : slot + 1] = [lane], [number]
        settles = self.changeover == "carry" and is_run(lane.realization.program)
        changeover = "fade" if settles else self.changeover  # it has not run over any input yet

        def undo() -> None:
            self.slots[number] = former

        if number != self.heard or self._change(former, slot, changeover, undo):
            self.slots[number] = slot
            self.notice = f"Lane {number + 1} is taken as it was saved, by {changeover}."

    def number_of(self, slot: int) -> int:
        """Of the lane that stands in a slot, or stood there before it was built anew."""
        return self._owners[slot]

    def _spare(self, number: int) -> int:
        for slot, owner in enumerate(self._owners):
            if owner == number and slot != self.slots[number]:
                return slot
        if len(self.lanes) == MOST_LANES:
            raise RequestError(f"All {MOST_LANES} places for lanes are taken, and a lane that is built anew needs one more.")
        return len(self.lanes)

    def _change(self, former: int, slot: int, changeover: str, undo: Callable[[], None]) -> bool:
        """Change between slots; whether it could be asked for. `undo` is called where it is refused."""
        try:
            ticket = self.card.change(planned(Change(NOW, slot, changeover), former, self.lanes))
        except RequestError as problem:
            self.notice = str(problem)
            return False
        self._asked[ticket] = undo
        return True

    def back(self) -> None:
        """The lane before."""
        self.hear(self.before)

    def next_changeover(self) -> None:
        self.changeover = CHANGEOVERS[(CHANGEOVERS.index(self.changeover) + 1) % len(CHANGEOVERS)]
        self.notice = f"A change takes over by {self.changeover}."

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
        self.card.set_monitor(self.monitor_db)

    def mute(self) -> None:
        self.card.mute()
        self.notice = "Muted."

    def come_up(self) -> None:
        self.card.come_up()
        self.notice = "Coming up."

    @property
    def subtracted(self) -> int | str | None:
        """What is subtracted from what is heard, as the host has it."""
        if not self.differs:
            return None
        return "ideal" if self.against == "ideal" else self.slots[self.before]

    def _subtract(self) -> None:
        self.card.subtract(self.subtracted, self.raise_db)
        named = "exact" if self.against == "ideal" else f"lane {self.before + 1}"
        self.notice = f"The difference from {named}, raised by {self.raise_db:g} dB." if self.differs else "No difference."
