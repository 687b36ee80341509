"""How near a standard curve's filter comes to the analogue curve, and whether it keeps the standard's limits."""

from dataclasses import dataclass

import numpy as np

from streamhost.errors import FilterError, nearest
from streamhost.filters import curves
from streamhost.filters.curves.goal import Goal
from streamhost.filters.curves.kinds import BILINEAR
from streamhost.filters.curves.limits import standard
from streamhost.filters.designs import design
from streamhost.filters.filter import Filter


@dataclass(frozen=True)
class Row:
    """What a filter does at one frequency of the standard; of a band filter relative to its gain at the mid-band."""

    goal: Goal
    found_db: float

    @property
    def deviation_db(self) -> float:
        """Its distance from what the standard wants, which is what the limits are about."""
        return self.found_db - self.goal.goal_db

    @property
    def met(self) -> bool:
        """Whether it keeps the limits."""
        return self.goal.lower_db <= self.deviation_db <= self.goal.upper_db


@dataclass(frozen=True)
class Fit:
    """A curve at a rate, judged at every frequency that its standard names.

    `order` is the filter's; `limits` says whose limits they are; `beyond_hz` lie above half the rate and are not judged.
    """

    name: str
    rate: float
    fit: str
    order: int
    limits: str
    rows: tuple[Row, ...]
    beyond_hz: tuple[float, ...]

    @property
    def met(self) -> bool:
        """Whether every row that the rate can reach keeps its limits."""
        return not self.failing

    @property
    def failing(self) -> tuple[Row, ...]:
        """The rows that miss their limits, rising."""
        return tuple(row for row in self.rows if not row.met)


def curve_fit(name: str, rate: object, fit: str | None = None, **parameters: object) -> Fit:
    """Judge design(name, rate=rate, fit=fit, ...) at every frequency that its standard names.

    `fit`: "bilinear" or "least-squares", unless given the kind's own default; K weighting and the bands have one way
    only, and name it "bilinear". FilterError as of `design`, and for a kind that is no standard curve.
    """
    kinds = {kind.name: kind for kind in curves.KINDS}
    if name not in kinds:
        hint = nearest(name, kinds) if isinstance(name, str) else ""
        raise FilterError(f"{name!r} is no standard curve.{hint} Curves are {', '.join(kinds)}.")
    given = parameters if fit is None else {**parameters, "fit": fit}
    made = design(name, rate=rate, **given)
    values = {each.name: given.get(each.name, each.default) for each in kinds[name].parameters}
    wanted = standard(name, values)
    reachable = [goal for goal in wanted.goals if goal.hertz <= made.rate / 2]
    return Fit(
        name,
        made.rate,
        str(values.get("fit", BILINEAR)),
        made.order,
        wanted.limits,
        tuple(map(Row, reachable, _gains(made, reachable, wanted.relative_to_hz))),
        tuple(goal.hertz for goal in wanted.goals if goal.hertz > made.rate / 2),
    )


def _gains(made: Filter, goals: list[Goal], relative_to_hz: float | None) -> list[float]:
    with np.errstate(divide="ignore"):
        gains = 20 * np.log10(np.abs(made.response([goal.hertz for goal in goals])))
    if relative_to_hz is not None:
        gains = gains - 20 * np.log10(np.abs(made.response(relative_to_hz)))
    return [float(gain) for gain in gains]
