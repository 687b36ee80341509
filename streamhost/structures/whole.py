"""The filter undivided: all factors multiplied exactly, each coefficient rounded once."""

from streamhost.filters import Filter, Polynomials
from streamhost.filters.exact import rounded
from streamhost.structures.division import Division, Ratio, trimmed
from streamhost.structures.form import Form
from streamhost.structures.scaling import rescaled


def divide(filter: Filter, form: Form, scaling: str | None) -> Division:
    """One section. One section is in every pairing and every order, so only the scaling makes a difference."""
    ratio = Ratio(*filter.ratio())
    section = trimmed(Polynomials(rounded(ratio.b), rounded(ratio.a)))
    scaled = rescaled((section,), scaling or "none", form.begins_with)
    undivided = ratio if scaled.front is None else None
    return Division(scaled.sections, scaled.front, "given", "given", scaling or "none", undivided, scaled.shifts)
