"""From the sum of all terms, which is 0, to the coefficients of a filter."""

from collections.abc import Mapping
from fractions import Fraction

from streamhost.filters.equation.linear import Signal
from streamhost.filters.equation.refusal import refused

Coefficients = tuple[list[Fraction], list[Fraction]]


def solved(text: str, terms: Mapping[Signal, Fraction], places: Mapping[Signal, int]) -> Coefficients:
    """(b, a) in ascending powers of z^-1, exact, a[0] = 1, where the terms add up to 0.

    `places` is where in the text each signal stands first. FilterError where there is no y[n] to divide by, and for a
    coefficient beyond float64.
    """
    leading = terms.get(("y", 0), Fraction(0))
    if leading == 0:
        of_y = [place for (name, _), place in places.items() if name == "y"]
        raise refused(
            text, places.get(("y", 0), min(of_y, default=0)),
            "y[n] is missing, or its terms cancel; the equation must say what y[n] is.",
        )
    divided = {signal: value / leading for signal, value in terms.items()}
    for signal, value in divided.items():
        if problem := _outside_float64(value):
            name, age = signal
            shown = f"{name}[n-{age}]" if age else f"{name}[n]"
            raise refused(text, places[signal], f"the coefficient of {shown}, divided by that of y[n], is {problem}.")
    return _in_order(divided, "x", -1), _in_order(divided, "y", 1)


def _outside_float64(value: Fraction) -> str:
    try:
        vanishes = float(value) == 0 and value != 0
    except OverflowError:
        return "larger than float64 holds (about 1.8e308)"
    return "smaller than float64 holds (about 4.9e-324), and not 0" if vanishes else ""


def _in_order(terms: Mapping[Signal, Fraction], wanted: str, sign: int) -> list[Fraction]:
    """By age, with zeros for what was not written; at least one."""
    oldest = max((age for name, age in terms if name == wanted), default=0)
    return [sign * terms.get((wanted, age), Fraction(0)) for age in range(oldest + 1)]
