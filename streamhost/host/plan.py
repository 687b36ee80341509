"""What is to happen at which frame: changes of the lane that is heard, of coefficients, of the source, of what is subtracted.

All is prepared here, outside the step, which takes it at the frame; of what was prepared nothing is freed before.
"""

from bisect import bisect_right
from dataclasses import dataclass
from typing import TYPE_CHECKING

from streamhost.errors import RequestError, nearest
from streamhost.host.banks import prepare_banks
from streamhost.host.carrying import Prepared, prepare_carry
from streamhost.host.lane import Lane
from streamhost.host.queue import Queue
from streamhost.host.records import (
    BANK,
    BANK_FRAMES,
    CHANGEOVERS,
    HEAR,
    IDEAL,
    LOGGED,
    MOST_LANES,
    NOTHING,
    PLACE,
    SUBTRACT,
    TAKE_SOURCE,
)
from streamhost.host.shared import Shared
from streamhost.host.sources import Source
from streamhost.program.carrying import frames_of_history, is_run

if TYPE_CHECKING:
    from collections.abc import Sequence

    from streamhost.host.engine import Host
    from streamhost.realization import Realization

FADE_S = 0.02
"""Of the changeover `fade`, unless said."""

STATE_TAKING = ("keep", "cold", "carry")
AS_IT_IS = -1


@dataclass(frozen=True)
class Change:
    """At `frame` of the run the lane numbered `lane`, from 0, is heard; its state by `changeover`."""

    frame: int
    lane: int
    changeover: str = "carry"


SPELLING = (
    "a change is FRAME:LANE:CHANGEOVER, for instance 48000:2:warm: frames are counted from 0, lanes from 1, and the changeover "
    f"is {', '.join(CHANGEOVERS)}."
)


def parse_change(text: str, lanes: int) -> Change:
    """A change as the command line states it, for so many lanes. RequestError for anything else."""
    frame, _, rest = text.partition(":")
    lane, _, changeover = rest.partition(":")
    if not (frame.isdecimal() and lane.isdecimal() and changeover in CHANGEOVERS):
        raise RequestError(f'"{text}": {SPELLING}{nearest(changeover, CHANGEOVERS)}')
    if not 1 <= int(lane) <= lanes:
        raise RequestError(f'"{text}": there is no lane {lane}: lanes are counted from 1 to {lanes}.')
    return Change(int(frame), int(lane) - 1, changeover)


@dataclass(frozen=True)
class Changed:
    """A change as the step made it: at which frame, and how many carried states did not fit their word."""

    frame: int
    lane: int
    before: int
    changeover: str
    clipped: int


def changes_made(shared: Shared, begins: int = 0) -> tuple[Changed, ...]:
    """The changes that the step has made, oldest first, of the last 256 actions; frames are counted from `begins`."""
    done = int(shared.meters["logged"][0])
    entries = [shared.log[k % LOGGED] for k in range(max(0, done - LOGGED), done)]
    return tuple(
        Changed(int(entry["frame"]) - begins, int(entry["lane"]), int(entry["before"]),
                CHANGEOVERS[int(entry["changeover"])], int(entry["clipped"]))
        for entry in entries if entry["kind"] == HEAR
    )


class Plan:
    """The changes of one host."""

    def __init__(self, host: "Host", queue: Queue) -> None:
        self._host, self._queue = host, queue
        self._heard: list[tuple[int, int]] = [(0, 0)]
        self._disturbed: dict[int, int] = {}

    @staticmethod
    def past_frames(lane: Lane) -> int:
        """Frames of past input that a state carried into the lane may need."""
        return frames_of_history(lane.realization.program)

    def heard_at(self, frame: int) -> int:
        """The lane that is heard just before a frame, by what is planned."""
        return self._heard[bisect_right([at for at, _ in self._heard], frame) - 1][1]

    def change(self, change: Change, *, fade_frames: int | None = None, given: Prepared | None = None) -> int:
        """Plan a change, all of it prepared now, unless the carried state is `given`; its ticket. A frame that is past is
        the next.

        Raises RequestError for a lane that is not there, an unknown changeover, and one that cannot be: `keep` between
        different diagrams or words, `carry` where no output is common, a change before one that is planned already.
        """
        host, lane = self._host, self._lane(change.lane)
        frame = max(change.frame, host.frames)
        if change.changeover not in CHANGEOVERS:
            raise RequestError(f'There is no changeover "{change.changeover}": {", ".join(CHANGEOVERS)}.'
                               + nearest(change.changeover, CHANGEOVERS))
        if frame < self._heard[-1][0]:
            raise RequestError(f"A change at frame {frame} comes before one that is planned for frame {self._heard[-1][0]}: "
                               "changes are planned in their order.")
        before = self.heard_at(frame)
        prepared = self._prepared(change, before, lane, frame, given)
        fade = int(FADE_S * host.rate) if fade_frames is None else fade_frames
        host.need("act")
        host.need("carry", prepared is not None)
        host.need("ideal", lane.ideal is not None)
        ticket = self._queue.put(
            host.begins + frame, HEAR, lane=change.lane, before=before, count=fade,
            changeover=CHANGEOVERS.index(change.changeover), kept=(prepared,),
            argument=AS_IT_IS if prepared is None else prepared.address,
        )
        self._heard.append((frame, change.lane))
        if change.changeover in STATE_TAKING:
            self._disturbed[change.lane] = frame
        return ticket

    def move(self, lane: int, realizations: "Sequence[Realization]", frame: int = 0) -> int:
        """Give a lane other coefficients: one set at once at a frame, or several, one every 32 frames, a ramp; its ticket.

        A ramp's first set comes at the next frame that is a multiple of 32. The realizations have the diagram, the words
        and the kernel of the lane's own, which the last of them takes the place of. RequestError where they do not.
        """
        host, moved = self._host, self._lane(lane)
        banks = prepare_banks(moved, realizations)
        frame = max(frame, host.frames)
        if len(realizations) > 1:
            frame = -(-frame // BANK_FRAMES) * BANK_FRAMES
        host.need("act")
        ticket = self._queue.put(host.begins + frame, BANK, lane=lane, count=len(realizations), argument=banks.address,
                                 ideal_argument=banks.ideal_address, kept=(banks, moved.banks))
        moved.moved_to(realizations[-1], banks)
        return ticket

    def take(self, source: Source, frame: int = 0) -> int:
        """Another source from a frame on; its ticket. RequestError where it has other channels."""
        host = self._host
        if source.kind != "device" and int(source.record["channels"][0]) != host.channels:
            raise RequestError(f"{source.said} has {source.record['channels'][0]} channels, and this host has {host.channels}.")
        host.need("act")
        host.need("generate", source.kind != "device")
        before, host.source = host.source, source
        return self._queue.put(host.begins + max(frame, host.frames), TAKE_SOURCE, lane=-1, argument=source.address,
                               kept=(source, before))

    def subtract(self, what: int | str | None, raise_db: float = 0.0, frame: int = 0) -> int:
        """From a frame on send to the monitor what is heard less another lane, or its "ideal", raised; None: less nothing."""
        host = self._host
        lane = NOTHING if what is None else IDEAL if what == "ideal" else int(what)
        if lane >= 0:
            self._lane(lane)
        if not -200.0 <= raise_db <= 200.0:
            raise RequestError(f"raise_db = {raise_db}: a difference is raised by at most 200 dB.")
        host.need("act")
        return self._queue.put(host.begins + max(frame, host.frames), SUBTRACT, lane=lane, value=10.0 ** (raise_db / 20.0))

    def place(self, lane: Lane, slot: int | None = None, frame: int = 0) -> int:
        """Run a lane more, from zero state at a frame on, in the next slot or in that of one that is not heard; its slot.

        RequestError where there is no room, the lane does not fit, or what is heard would be lost.
        """
        host = self._host
        slot = len(host.lanes) if slot is None else slot
        if slot >= MOST_LANES or slot > len(host.lanes):
            raise RequestError(f"A host runs at most {MOST_LANES} lanes, and lane {len(host.lanes) + 1} is the next.")
        if slot < len(host.lanes) and slot in (self._heard[-1][1], host.heard):
            raise RequestError(f"Lane {slot + 1} is heard: change to another before it is replaced.")
        host.check(lane)
        frame = max(frame, host.frames)
        host.adopt(lane, slot)
        host.need("act")
        host.need("mix")
        host.need("ideal", lane.ideal is not None)
        before = host.lanes[slot : slot + 1]
        host.lanes[slot : slot + 1] = [lane]
        self._disturbed[slot] = frame
        self._queue.put(host.begins + frame, PLACE, lane=slot, argument=lane.address, kept=(lane, before))
        return slot

    def tend(self) -> None:
        """Free what the step has done with; to be called now and then in long runs."""
        self._queue.tend()

    @property
    def changed(self) -> tuple[Changed, ...]:
        """The changes that the step has made, oldest first, of the last 256 that it did."""
        return changes_made(self._host.shared, self._host.begins)

    def _lane(self, number: int) -> Lane:
        if not 0 <= number < len(self._host.lanes):
            raise RequestError(f"There is no lane {number + 1}: lanes are counted from 1 to {len(self._host.lanes)}.")
        return self._host.lanes[number]

    def _prepared(self, change: Change, before: int, lane: Lane, frame: int, given: Prepared | None) -> Prepared | None:
        old = self._host.lanes[before]
        if change.changeover == "keep" and old.realization.program.key != lane.realization.program.key:
            raise RequestError(
                f"keep takes the state of lane {before + 1} as it is under the coefficients of lane {change.lane + 1}, and the "
                "two differ in diagram or words. Use carry, warm, fade or cold."
            )
        if change.changeover != "carry" or old is lane:
            return None
        if not is_run(lane.realization.program):
            prepared = given or prepare_carry(old, lane)
            if prepared.past_frames > self._host.past_frames:
                raise RequestError(f"Lane {change.lane + 1} holds {prepared.past_frames} frames of past input, and this host "
                                   f"keeps {self._host.past_frames}. Use warm or fade.")
            return prepared
        self._has_run(change.lane, frame)
        return None

    def _has_run(self, lane: int, frame: int) -> None:
        """A long response that ends is in the lane's state already, once it has run over as many inputs."""
        needed = self._host.lanes[lane].realization.program.state_words
        if lane in self._disturbed and frame < self._disturbed[lane] + needed:
            raise RequestError(
                f"Lane {lane + 1} continues another once it has run over its last {needed} inputs, which it has at frame "
                f"{self._disturbed[lane] + needed}."
            )
