"""The names that can be chosen beside the form, and how an unknown name is refused."""

from collections.abc import Iterable

from streamhost.errors import StructureError, nearest

DECOMPOSITIONS = ("whole", "cascade", "parallel")
PAIRINGS = ("nearest", "given")
ORDERINGS = ("outward", "inward", "given", "quietest")
OUTPUTS = ("main", "all")
SCALINGS = ("none", "l1", "l2", "linf", "l1-shift", "l2-shift", "linf-shift")


def decompositions() -> tuple[str, ...]:
    """The names of the ways in which a filter is divided before it is drawn."""
    return DECOMPOSITIONS


def check(what: str, name: object, allowed: Iterable[str]) -> None:
    """StructureError unless a name is among the allowed ones."""
    names = tuple(allowed)
    if name not in names:
        hint = nearest(name, names) if isinstance(name, str) else ""
        raise StructureError(f"there is no {what} {name!r}.{hint} Allowed are {', '.join(names)}.")


def check_all(
    decomposition: str, pairing: str | None, ordering: str | None, scaling: str | None, outputs: str | None = None
) -> None:
    """StructureError on the first name that is not known; None is a choice that was not stated."""
    check("decomposition", decomposition, DECOMPOSITIONS)
    stated = (("pairing", pairing, PAIRINGS), ("ordering", ordering, ORDERINGS), ("scaling", scaling, SCALINGS),
              ("outputs", outputs, OUTPUTS))
    for what, name, allowed in stated:
        if name is not None:
            check(what, name, allowed)
