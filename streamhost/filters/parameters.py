"""The parameters that a kind of filter declares, and what is allowed in each."""

from collections.abc import Sequence
from dataclasses import dataclass
from math import inf
from numbers import Integral
from typing import Protocol

from streamhost.errors import FilterError
from streamhost.filters import entry


class Range(Protocol):
    """What a parameter accepts. `rate` is None where the rate itself is wrong."""

    def allowed(self, rate: float | None) -> str: ...

    def taken(self, value: object, rate: float | None) -> object | None:
        """The value as the design formulas want it, or None where it is not allowed."""


@dataclass(frozen=True)
class Above:
    """A finite number above a limit and at most another."""

    low: float
    high: float = inf

    def allowed(self, rate: float | None) -> str:
        top = "" if self.high == inf else f", at most {self.high:g}"
        return f"a finite number above {self.low:g}{top}"

    def taken(self, value: object, rate: float | None) -> float | None:
        number = _float(value)
        return number if number is not None and self.low < number <= self.high else None


@dataclass(frozen=True)
class Between:
    """A number from one limit to another, both allowed."""

    low: float
    high: float

    def allowed(self, rate: float | None) -> str:
        return f"a number from {self.low:g} to {self.high:g}"

    def taken(self, value: object, rate: float | None) -> float | None:
        number = _float(value)
        return number if number is not None and self.low <= number <= self.high else None


@dataclass(frozen=True)
class Inside:
    """A number between two limits, both left out."""

    low: float
    high: float

    def allowed(self, rate: float | None) -> str:
        return f"a number above {self.low:g} and below {self.high:g}"

    def taken(self, value: object, rate: float | None) -> float | None:
        number = _float(value)
        return number if number is not None and self.low < number < self.high else None


@dataclass(frozen=True)
class Choice:
    """One of some numbers."""

    numbers: tuple[float, ...]

    def allowed(self, rate: float | None) -> str:
        return "one of " + ", ".join(f"{number:g}" for number in self.numbers)

    def taken(self, value: object, rate: float | None) -> float | None:
        number = _float(value)
        return number if number in self.numbers else None


@dataclass(frozen=True)
class Count:
    """A whole number from one limit to another, both allowed."""

    low: int
    high: int

    def allowed(self, rate: float | None) -> str:
        return f"a whole number from {self.low} to {self.high}"

    def taken(self, value: object, rate: float | None) -> int | None:
        if not isinstance(value, Integral) or isinstance(value, bool):
            return None
        return int(value) if self.low <= int(value) <= self.high else None


@dataclass(frozen=True)
class Word:
    """One of some words."""

    words: tuple[str, ...]

    def allowed(self, rate: float | None) -> str:
        return "one of " + ", ".join(self.words)

    def taken(self, value: object, rate: float | None) -> str | None:
        return value if isinstance(value, str) and value in self.words else None


@dataclass(frozen=True)
class Frequency:
    """A number of hertz between 0 and half the rate, both left out."""

    def allowed(self, rate: float | None) -> str:
        half = "" if rate is None else f" ({rate / 2:g})"
        return f"a number above 0 and below half the rate{half}"

    def taken(self, value: object, rate: float | None) -> float | None:
        return Above(0.0).taken(value, rate) if rate is None or _below_half(value, rate) else None


@dataclass(frozen=True)
class Edges:
    """One frequency, or two that rise."""

    def allowed(self, rate: float | None) -> str:
        return f"{Frequency().allowed(rate)}, or a list of two such that rise"

    def taken(self, value: object, rate: float | None) -> float | tuple[float, float] | None:
        if not isinstance(value, Sequence) or isinstance(value, str):
            return Frequency().taken(value, rate)
        edges = [Frequency().taken(edge, rate) for edge in value]
        if len(edges) != 2 or edges[0] is None or edges[1] is None or edges[0] >= edges[1]:
            return None
        return edges[0], edges[1]


@dataclass(frozen=True)
class Pair:
    """Two frequencies that rise."""

    def allowed(self, rate: float | None) -> str:
        half = "" if rate is None else f" ({rate / 2:g})"
        return f"a list of two numbers that rise, above 0 and below half the rate{half}"

    def taken(self, value: object, rate: float | None) -> tuple[float, float] | None:
        edges = Edges().taken(value, rate)
        return edges if isinstance(edges, tuple) else None


@dataclass(frozen=True)
class Parameter:
    """One parameter of a kind: required unless it has a default or is one of several alternatives."""

    name: str
    unit: str
    meaning: str
    range: Range
    default: object = None


def _float(value: object) -> float | None:
    try:
        return float(entry.number(value, ""))
    except FilterError:
        return None


def _below_half(value: object, rate: float) -> bool:
    number = _float(value)
    return number is not None and number < rate / 2
