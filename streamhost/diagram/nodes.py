"""The nine kinds of node of a signal-flow graph: the whole vocabulary on one page.

A node refers to others by their index in the diagram. Each says what it reads, what of that it needs *now* (in the
same frame), how many words it stores and how many multiplications and additions it makes; the checker, the scheduler,
the analysis and the drawing ask the node.
"""

from dataclasses import dataclass
from typing import ClassVar

from streamhost.formats import Quantizer


@dataclass(frozen=True)
class Node:
    """What every node answers."""

    label: str
    kind: ClassVar[str] = ""
    linear: ClassVar[bool] = True

    @property
    def reads(self) -> tuple[int, ...]:
        return ()

    @property
    def needs_now(self) -> tuple[int, ...]:
        return self.reads

    @property
    def stores(self) -> int:
        """Words of memory, which are also the node's states."""
        return 0

    @property
    def multiplications(self) -> int:
        return 0

    @property
    def additions(self) -> int:
        return 0


@dataclass(frozen=True)
class Input(Node):
    """One channel of the filter's input."""

    kind: ClassVar[str] = "input"


@dataclass(frozen=True)
class OneSource(Node):
    """A node that reads one other node."""

    source: int

    @property
    def reads(self) -> tuple[int, ...]:
        return (self.source,)


@dataclass(frozen=True)
class Output(OneSource):
    """What goes out; `label` is its name."""

    kind: ClassVar[str] = "output"


@dataclass(frozen=True)
class Delay(OneSource):
    """z^-n. It needs nothing now, which is what makes a loop possible."""

    n: int = 1
    kind: ClassVar[str] = "delay"

    @property
    def needs_now(self) -> tuple[int, ...]:
        return ()

    @property
    def stores(self) -> int:
        return self.n


@dataclass(frozen=True)
class Gain(OneSource):
    """A multiplication by a stored coefficient, whatever its value; `coefficient` is its slot."""

    coefficient: int
    kind: ClassVar[str] = "gain"

    @property
    def multiplications(self) -> int:
        return 1


@dataclass(frozen=True)
class Shift(OneSource):
    """2^k of the structure itself: no coefficient, no multiplication."""

    k: int
    kind: ClassVar[str] = "shift"


@dataclass(frozen=True)
class Term:
    """A signed term of a sum; `sign` is +1 or -1."""

    sign: int
    source: int


@dataclass(frozen=True)
class Sum(Node):
    """Signed terms, added left to right.

    `grow` marks a register `grow` integer bits longer than the signal, which wraps and is read whole. `exact` is set in
    programs on a sum of stored values that is made in as many bits as it needs.
    """

    terms: tuple[Term, ...]
    grow: int | None = None
    exact: bool = False
    kind: ClassVar[str] = "sum"

    @property
    def reads(self) -> tuple[int, ...]:
        return tuple(term.source for term in self.terms)

    @property
    def additions(self) -> int:
        return len(self.terms) - 1


@dataclass(frozen=True)
class Taps(OneSource):
    """A tapped delay line with its weighted sum; `coefficients` are slots in the order of addition, one a tap.

    Tap 0 is added first, or last where `last_first` says so.

    Folded ("even" or "odd" symmetry), taps from both ends are added or subtracted before one shared multiplication:
    `coefficients` then holds one slot a pair, and one for the middle tap of an odd length.
    """

    coefficients: tuple[int, ...]
    length: int
    fold: str | None = None
    last_first: bool = False
    kind: ClassVar[str] = "taps"

    @property
    def stores(self) -> int:
        return self.length - 1

    @property
    def multiplications(self) -> int:
        return len(self.coefficients)

    @property
    def additions(self) -> int:
        return self.length - 1


@dataclass(frozen=True)
class Round(OneSource):
    """A register where the rules give none. In a program every rounding is such a node and states its quantizer."""

    quantizer: Quantizer | None = None
    kind: ClassVar[str] = "round"


@dataclass(frozen=True)
class Residue(OneSource):
    """What the rounding of its register dropped in this frame: before minus after, overflow excluded."""

    kind: ClassVar[str] = "residue"


@dataclass(frozen=True)
class Slot:
    """A stored coefficient: its name, the section it belongs to (None: none), the polynomial ("b", "a", "c" or "").

    `feedback` marks a coefficient that a minus at its adder subtracts, and which `feedback = "negated"` stores with
    the sign turned.
    """

    label: str
    section: int | None = None
    part: str = ""
    feedback: bool = False
