"""Which parameters of a [[filter]] can be turned while it runs, and the positions that a preset states for them."""

from collections.abc import Mapping
from typing import Any

from streamhost.errors import nearest
from streamhost.filters.designs import KINDS
from streamhost.presets.lines import Path
from streamhost.presets.mistakes import Mistakes, listed, one_line

THIRD_OCTAVE = 2.0 ** (1.0 / 3.0)
HALF_OCTAVE = 2.0**0.5
RATIOS = {"frequency": THIRD_OCTAVE, "stop_frequency": THIRD_OCTAVE, "q": HALF_OCTAVE, "bandwidth": HALF_OCTAVE,
          "slope": HALF_OCTAVE}
DECIBELS = {"gain_db": 3.0}
"""One step to a neighbour: a third of an octave, a half, 3 dB."""


def check_positions(mistakes: Mistakes, table: Mapping[str, Any], path: Path, rate: float | None) -> None:
    """`positions` of a [[filter]]: for parameters that it states, lists of values that each may have."""
    stated, kind = table["positions"], KINDS.get(str(table.get("kind")))
    if not isinstance(stated, dict):
        mistakes.value((*path, "positions"), stated, "is not allowed: positions.frequency = [100, 200] and the like.")
        return
    ranges = {each.name: each.range for each in kind.parameters if each.name in table} if kind is not None else {}
    able = [name for name in ranges if name in RATIOS or name in DECIBELS]
    for key, values in stated.items():
        here = (*path, "positions", key)
        if key not in able:
            mistakes.add(here, f"{one_line(key)} is no parameter that this [[filter]] states and that can be turned: "
                               f"{listed(able) if able else 'it has none'}.{nearest(key, able)}")
        elif not isinstance(values, list) or not values:
            mistakes.value(here, values, "is not allowed: a list of positions, for instance [100, 200].")
        else:
            for place, value in enumerate(values):
                if ranges[key].taken(value, rate) is None:
                    mistakes.value((*here, place), value, f"is not allowed: {ranges[key].allowed(rate)}.")
