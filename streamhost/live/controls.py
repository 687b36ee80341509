"""What an engineer does at a running host, by keys or by words: the same for a terminal and a page."""

from collections.abc import Callable, Sequence

from streamhost.errors import RequestError
from streamhost.host.carrying import prepare_carry
from streamhost.host.hearing import Hearing
from streamhost.host.lane import Lane
from streamhost.host.plan import Change
from streamhost.host.records import MOST_LANES
from streamhost.live.card import Card
from streamhost.live.recipe import LaneAsked, Planned
from streamhost.program.carrying import is_run

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


class Controls(Hearing):
    """The settings of one card.

    lanes: the parent's, which never run, by the slot of the host that they stand in. slots: that of each lane, by its number;
    a lane that is built anew takes turns between two.
    """

    def __init__(
        self, card: Card, lanes: list[Lane], chosen: int = 0, *, changeover: str = "carry", monitor_db: float = 0.0
    ) -> None:
        super().__init__(chosen, changeover, monitor_db)
        self.card, self.lanes = card, lanes
        self.slots, self._owners = list(range(len(lanes))), list(range(len(lanes)))
        self._asked: dict[int, Callable[[], None]] = {}

    @property
    def lane_count(self) -> int:
        return len(self.slots)

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

    def _change_to(self, lane: int) -> bool:
        former = self.chosen, self.before

        def undo() -> None:
            self.chosen, self.before = former

        return self._change(self.slots[self.chosen], self.slots[lane], self.changeover, undo)

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

        if number != self.chosen or self._change(former, slot, changeover, undo):
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

    def mute(self) -> None:
        self.card.mute()
        self.notice = "Muted."

    def come_up(self) -> None:
        self.card.come_up()
        self.notice = "Coming up."

    def _send_difference(self, reference: int | str | None) -> bool:
        self.card.subtract(self.slots[reference] if isinstance(reference, int) else reference, self.raise_db)
        return True

    def _send_monitor(self) -> None:
        self.card.set_monitor(self.monitor_db)
