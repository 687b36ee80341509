"""What is declared of a kind of filter, once: its name, its parameters, their ranges, and what builds it."""

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any

from streamhost.filters.filter import Filter
from streamhost.filters.parameters import Parameter

Values = Mapping[str, Any]
"""Parameters by name, checked against the declared ranges before any formula sees them."""


def _no_conflicts(values: Values) -> list[str]:
    return []


@dataclass(frozen=True)
class Kind:
    """A kind of filter. Of `alternatives` exactly one is given; `conflicts` says which values do not go together.

    `build(rate, **values)` makes the filter; it may raise FilterError for what only the formulas can know.
    """

    name: str
    meaning: str
    source: str
    parameters: tuple[Parameter, ...]
    build: Callable[..., Filter]
    alternatives: tuple[str, ...] = ()
    conflicts: Callable[[Values], list[str]] = _no_conflicts
