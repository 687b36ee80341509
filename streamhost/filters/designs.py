"""The kinds of filter that can be asked for by name and parameters, each declared once."""

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from math import sqrt
from typing import Any

from streamhost.errors import FilterError, nearest
from streamhost.filters import classic, cookbook, entry
from streamhost.filters.filter import Filter
from streamhost.filters.parameters import Above, Between, Count, Edges, Frequency, Parameter, Word

Values = Mapping[str, Any]  # checked against the declared ranges before any formula sees them


def _no_conflicts(values: Values) -> list[str]:
    return []


@dataclass(frozen=True)
class Kind:
    """A kind of filter. Of `alternatives` exactly one is given; `conflicts` says which values do not go together."""

    name: str
    meaning: str
    source: str
    parameters: tuple[Parameter, ...]
    build: Callable[..., Filter]
    alternatives: tuple[str, ...] = ()
    conflicts: Callable[[Values], list[str]] = _no_conflicts


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
        f'parameter "{name}" is unknown.{nearest(name, names)} Known are {", ".join(names)}'
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


def _slope_conflicts(values: Values) -> list[str]:
    if "slope" not in values:
        return []
    limit = cookbook.steepest_slope(values["gain_db"])
    if values["slope"] < limit:
        return []
    return [f"slope is {values['slope']:g}; at {values['gain_db']:g} dB it must be below {limit:g}"]


def _edge_conflicts(values: Values) -> list[str]:
    response, frequency = values["response"], values["frequency"]
    wanted = 2 if response in classic.BANDS else 1
    found = len(frequency) if isinstance(frequency, tuple) else 1
    if found == wanted:
        return []
    return [f"frequency gives {found} edge{'s' * (found > 1)}, and a {response} has {wanted}"]


def _elliptic_conflicts(values: Values) -> list[str]:
    problems = _edge_conflicts(values)
    if values["stopband_db"] <= values["ripple_db"]:
        problems.append(
            f"stopband_db is {values['stopband_db']:g}; it must be above ripple_db, {values['ripple_db']:g}"
        )
    return problems


COOKBOOK = "W3C Audio Working Group Note, Audio EQ Cookbook, 2021"
CLASSIC = "analogue prototype and bilinear transform with the edges prewarped; Oppenheim & Schafer, ch. 7"

FREQUENCY = Parameter("frequency", "Hz", "cut-off or centre", Frequency())
Q = Parameter("q", "", "quality factor", Above(0.0))
FLAT_Q = Parameter("q", "", "quality factor; 1/sqrt(2) is maximally flat", Above(0.0), default=1 / sqrt(2))
# A factor of a million: no equalizer asks for more (common practice), and a larger figure is most often
# a frequency or a factor in the wrong place.
GAIN = Parameter("gain_db", "dB", "gain at the centre or on the shelf", Between(-120.0, 120.0))
# Ten octaves is 20 Hz to 20 kHz.
BANDWIDTH = Parameter("bandwidth", "octaves", "between the points at half the gain in dB", Above(0.0, 10.0))
SLOPE = Parameter("slope", "", "shelf slope, 1 the steepest without overshoot", Above(0.0))
RESPONSE = Parameter("response", "", "which band passes or stops", Word(tuple(classic.RESPONSES)))
ORDER = Parameter("order", "", "order of the prototype; a band has twice as many poles", Count(1, 64))
EDGES = Parameter("frequency", "Hz", "edge of the pass-band, or two for a band", Edges())
RIPPLE = Parameter("ripple_db", "dB", "ripple in the pass-band", Between(1e-6, 20.0))
STOPBAND = Parameter("stopband_db", "dB", "attenuation in the stop-band", Above(0.0, 300.0))

KINDS: Mapping[str, Kind] = {
    kind.name: kind
    for kind in (
        Kind("low-pass", "passes below the frequency", COOKBOOK, (FREQUENCY, FLAT_Q), cookbook.low_pass),
        Kind("high-pass", "passes above the frequency", COOKBOOK, (FREQUENCY, FLAT_Q), cookbook.high_pass),
        Kind("band-pass", "passes about the frequency, 0 dB there", COOKBOOK, (FREQUENCY, Q), cookbook.band_pass),
        Kind("notch", "takes the frequency out", COOKBOOK, (FREQUENCY, Q), cookbook.notch),
        Kind("all-pass", "turns the phase, 180 degrees at the frequency", COOKBOOK, (FREQUENCY, Q), cookbook.all_pass),
        Kind(
            "peak",
            "raises or lowers a bell about the frequency",
            COOKBOOK,
            (FREQUENCY, GAIN, Q, BANDWIDTH),
            cookbook.peak,
            alternatives=("q", "bandwidth"),
        ),
        Kind(
            "low-shelf",
            "raises or lowers what is below the frequency, half the gain there",
            COOKBOOK,
            (FREQUENCY, GAIN, Q, SLOPE),
            cookbook.low_shelf,
            alternatives=("q", "slope"),
            conflicts=_slope_conflicts,
        ),
        Kind(
            "high-shelf",
            "raises or lowers what is above the frequency, half the gain there",
            COOKBOOK,
            (FREQUENCY, GAIN, Q, SLOPE),
            cookbook.high_shelf,
            alternatives=("q", "slope"),
            conflicts=_slope_conflicts,
        ),
        Kind(
            "butterworth",
            "maximally flat, -3.01 dB at the edges",
            CLASSIC,
            (RESPONSE, ORDER, EDGES),
            classic.butterworth,
            conflicts=_edge_conflicts,
        ),
        Kind(
            "elliptic",
            "equal ripple in pass-band and stop-band, the steepest of its order",
            CLASSIC,
            (RESPONSE, ORDER, EDGES, RIPPLE, STOPBAND),
            classic.elliptic,
            conflicts=_elliptic_conflicts,
        ),
    )
}
