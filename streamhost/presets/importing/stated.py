"""What a file of coefficients states, before anything that it leaves open is decided."""

from collections.abc import Iterable, Mapping
from dataclasses import dataclass

from streamhost.errors import RequestError
from streamhost.presets.mistakes import listed, one_line

MOST_NUMBERS = 20_000
"""As many as fit a preset of the largest size, however long each of them is written."""


@dataclass(frozen=True)
class Number:
    """A number with its place in the file, as a message names it.

    `value` is an int where the file has an integer: 1.0 is none. `pattern`: it was written in hexadecimal, and so may
    be the bits of a negative code.
    """

    value: int | float
    place: str
    pattern: bool = False


Numbers = tuple[Number, ...]


@dataclass(frozen=True)
class Rows:
    """A row for each section; `columns` says what stands in a row, where the file names them."""

    rows: tuple[Numbers, ...]
    columns: tuple[str, ...] | None = None


@dataclass(frozen=True)
class Flat:
    """One list of numbers of which the file does not say what they are."""

    numbers: Numbers


@dataclass(frozen=True)
class Lists:
    """Pairs of b and a, in cascade, in ascending powers of z^-1; a is empty where it is not stated."""

    pairs: tuple[tuple[Numbers, Numbers], ...]


@dataclass(frozen=True)
class Roots:
    """Zeros, poles and the factor before them."""

    zeros: tuple[complex, ...]
    poles: tuple[complex, ...]
    factor: float


@dataclass(frozen=True)
class Reading:
    """What a reader found, and what a user should know of how it was found."""

    stated: Rows | Flat | Lists | Roots
    notes: tuple[str, ...] = ()


@dataclass(frozen=True)
class Section:
    """A part of the filter whose coefficients are told apart, not yet their sign or scale.

    a0 is None where the file leaves it out; `feedback` is a1, a2 and so on.
    """

    b: Numbers
    a0: Number | None
    feedback: Numbers

    @property
    def numbers(self) -> Numbers:
        return self.b + ((self.a0,) if self.a0 else ()) + self.feedback

    @property
    def is_recursive(self) -> bool:
        return any(number.value != 0 for number in self.feedback)


Sections = tuple[Section, ...]


def refused(place: str, message: str) -> RequestError:
    return RequestError(f"{place}: {message}")


def checked_count(count: int) -> None:
    """Raises RequestError for more numbers than a preset holds."""
    if count > MOST_NUMBERS:
        raise RequestError(f"the file has more than {MOST_NUMBERS} numbers, which is more than a preset holds.")


def numbered(values: Iterable[int | float], name: str) -> Numbers:
    """Numbers with their places, such as b[3]."""
    return tuple(Number(value, f"{name}[{i}]") for i, value in enumerate(values))


def way_stated(names: Iterable[str], ways: Mapping[str, tuple[str, ...]], what: str) -> tuple[str, tuple[str, ...]]:
    """Which way of stating a filter the names amount to, and a note on those that belong to none.

    A way is given by its description and all names that it can have, the first of them always. `what` is how a name
    is called: key or array. RequestError where they amount to none or to several.
    """
    given = tuple(names)
    found = [way for way, known in ways.items() if known[0] in given]
    if len(found) != 1:
        said = f"no {what} that states a filter" if not found else f"{len(found)} filters, {' and '.join(found)}"
        raise RequestError(f"the file has {said}: it states one, by {listed(ways)}.")
    ignored = [name for name in given if name not in ways[found[0]]]
    return found[0], ((f"not read: {what} {', '.join(map(one_line, ignored))}",) if ignored else ())
