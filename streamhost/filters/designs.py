"""The kinds of filter that can be asked for by name and parameters; each family declares its own."""

from collections.abc import Mapping

from streamhost.errors import FilterError, nearest
from streamhost.filters import classic, cookbook, crossovers, curves, entry, fir, simple
from streamhost.filters.filter import Filter
from streamhost.filters.kind import Kind

FAMILIES = (cookbook, classic, crossovers, simple, fir, curves)
KINDS: Mapping[str, Kind] = {kind.name: kind for family in FAMILIES for kind in family.KINDS}


def design(kind: str, *, rate: object, **parameters: object) -> Filter:
    """A filter of a named kind, such as design("peak", rate=48000, frequency=1000, gain_db=6, q=0.707).

    All mistakes of the call are reported together in one FilterError.
    """
    spec = KINDS.get(kind) if isinstance(kind, str) else None
    if spec is None:
        hint = nearest(kind, KINDS) if isinstance(kind, str) else ""
        raise FilterError(f"there is no kind of filter {kind!r}.{hint} Kinds are {', '.join(KINDS)}.")
    checked_rate, problems = _rate(rate)
    values, more = _values(spec, parameters, checked_rate)
    problems += more or spec.conflicts(values)
    if problems or checked_rate is None:
        raise FilterError(f'the filter "{spec.name}" cannot be: {"; ".join(problems)}.')
    try:
        return spec.build(checked_rate, **values)
    except (FilterError, ArithmeticError, ValueError) as error:
        given = ", ".join(f"{name} {value}" for name, value in values.items())
        reason = str(error).rstrip(".")
        raise FilterError(
            f'the filter "{spec.name}" at {checked_rate:g} Hz with {given} cannot be: {reason}.'
        ) from error


def kinds() -> tuple[str, ...]:
    """The names that `design` knows."""
    return tuple(KINDS)


def _rate(rate: object) -> tuple[float | None, list[str]]:
    try:
        return entry.rate(rate), []
    except FilterError as error:
        return None, [str(error).rstrip(".")]


def _values(spec: Kind, given: Mapping[str, object], rate: float | None) -> tuple[dict[str, object], list[str]]:
    """What the formulas are called with, and everything that is wrong with what was given."""
    names = [parameter.name for parameter in spec.parameters]
    problems = [
        f'parameter "{name}" is unknown.{nearest(name, names)} Known are {", ".join(names) or "none"}'
        for name in given
        if name not in names
    ]
    values: dict[str, object] = {}
    for parameter in spec.parameters:
        value = given.get(parameter.name, parameter.default)
        if value is not None:
            taken = parameter.range.taken(value, rate)
            values[parameter.name] = taken
            if taken is None:
                allowed = parameter.range.allowed(rate)
                problems.append(f"{parameter.name} is {value!r}, allowed is {allowed}")
        elif parameter.name not in spec.alternatives:
            allowed = parameter.range.allowed(rate)
            problems.append(f"{parameter.name} ({parameter.meaning}) is missing, allowed is {allowed}")
    chosen = [name for name in spec.alternatives if name in values]
    if spec.alternatives and len(chosen) != 1:
        found = "both are" if chosen else "neither is"
        problems.append(f"exactly one of {' and '.join(spec.alternatives)} must be given, and {found}")
    return values, problems
