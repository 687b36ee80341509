"""One row of a standard's table."""

from dataclasses import dataclass


@dataclass(frozen=True)
class Goal:
    """At `hertz` the network has `analogue_db`; the standard wants `goal_db` + `lower_db` to `goal_db` + `upper_db`."""

    hertz: float
    analogue_db: float
    goal_db: float
    lower_db: float
    upper_db: float
