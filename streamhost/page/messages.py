"""What a page may send: a closed list of words, each checked, none longer than a line, no more of them than a hand presses."""

import time
from collections.abc import Callable
from typing import Annotated, Literal

import msgspec

from streamhost.page.sitting import Sitting

LONGEST = 512
"""Bytes of a message."""

A_SECOND, AT_ONCE = 90.0, 180.0
"""Messages that are taken: a held key repeats 30 times a second, and the page asks for a picture 30 times."""

SOURCES = ("silence", "tone:1000", "tones:60,7000", "sweep:20,20000,10", "white", "pink", "impulses:1")

Number = Annotated[int, msgspec.Meta(ge=1, le=16)]
Step = Literal[-1, 1]


class Message(msgspec.Struct, tag_field="do", forbid_unknown_fields=True):
    """Each has its name as `do`."""


class Open(Message, tag="open"):
    """The first one: the key of the page's address."""

    key: Annotated[str, msgspec.Meta(max_length=100)]


class Next(Message, tag="next"):
    """The last picture has been drawn: another may come."""


class Hear(Message, tag="hear"):
    lane: Number


class Back(Message, tag="back"):
    pass


class TakeOverBy(Message, tag="changeover"):
    by: Literal["keep", "cold", "carry", "warm", "fade"]


class Difference(Message, tag="difference"):
    pass


class OtherReference(Message, tag="reference"):
    pass


class Raised(Message, tag="raise"):
    steps: Step


class Louder(Message, tag="monitor"):
    steps: Step


class Take(Message, tag="source"):
    what: Literal["silence", "tone:1000", "tones:60,7000", "sweep:20,20000,10", "white", "pink", "impulses:1"]


class Mute(Message, tag="mute"):
    pass


class ComeUp(Message, tag="rise"):
    pass


Action = Hear | Back | TakeOverBy | Difference | OtherReference | Raised | Louder | Take | ComeUp
Any = Open | Next | Mute | Action

_decoder = msgspec.json.Decoder(Any)


def decode(text: str) -> Any:
    """A message. msgspec.DecodeError for what is none."""
    return _decoder.decode(text)


def act(sitting: Sitting, action: Action) -> None:
    """Do what was asked for."""
    match action:
        case Hear():
            sitting.hear(action.lane - 1)
        case Back():
            sitting.back()
        case TakeOverBy():
            sitting.take_over_by(action.by)
        case Difference():
            sitting.difference()
        case OtherReference():
            sitting.other_reference()
        case Raised():
            sitting.raised(action.steps)
        case Louder():
            sitting.louder(action.steps)
        case Take():
            sitting.take(action.what)
        case ComeUp():
            sitting.come_up()


class Allowance:
    """So many messages at once, and so many more a second."""

    def __init__(self, clock: Callable[[], float] = time.monotonic) -> None:
        self._clock, self._left, self._at = clock, AT_ONCE, clock()

    def is_spent(self) -> bool:
        """Whether one more is too many."""
        now = self._clock()
        self._left = min(AT_ONCE, self._left + (now - self._at) * A_SECOND) - 1.0
        self._at = now
        return self._left < 0.0
