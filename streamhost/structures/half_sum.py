"""What the forms that are half the sum of two all-passes have in common: what they carry, and how the branches end."""

from streamhost.diagram.builder import Ref, Signed, minus
from streamhost.diagram.hints import Point
from streamhost.structures.all_pass import HALF, Halves, halves
from streamhost.structures.division import Ratio
from streamhost.structures.form import Draft


def carries(ratio: Ratio) -> str:
    """Why a filter is not such a sum, "" where it is."""
    found = halves(ratio)
    return found if isinstance(found, str) else ""


def halves_of(ratio: Ratio) -> Halves:
    """The two all-passes of what is carried."""
    found = halves(ratio)
    assert isinstance(found, Halves), "what cannot be carried is not drawn"
    return found


def join(draft: Draft, halves: Halves, first: Ref, second: Ref, *, at: Point) -> Ref:
    """c (s0 first + s1 second), a shift where c is 1/2, drawn from the adder on; beside it the complement."""
    column, row = at
    terms = [_signed(ref, sign) for ref, sign in zip((first, second), halves.signs, strict=True)]
    y = _scaled(draft, halves, "y", draft.add("sum", terms, at=at), (column + 0.875, row))
    if draft.all_outputs:
        others = [_signed(first, halves.signs[0]), _signed(second, -halves.signs[1])]
        below = (column, row + 1)
        difference = draft.add("difference", others, at=below)
        complement = _scaled(draft, halves, "complement", difference, (column + 0.875, row + 1))
        draft.offer("complement", complement, at=(column + 1.75, row + 1))
    return y


def _scaled(draft: Draft, halves: Halves, name: str, source: Ref, at: Point) -> Ref:
    if halves.c == HALF:
        return draft.shift(name, -1, source, at=at)
    return draft.gain("c0", float(halves.c), source, at=at)


def _signed(ref: Ref, sign: int) -> Ref | Signed:
    return ref if sign > 0 else minus(ref)
