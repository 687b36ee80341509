"""Which sign the feedback coefficients have: found where only one gives a stable filter, else asked for."""

from collections.abc import Callable

from streamhost.errors import RequestError
from streamhost.filters import Filter
from streamhost.filters.exact import exactly, stripped
from streamhost.filters.factors import Polynomials
from streamhost.filters.stability import is_stable
from streamhost.presets.importing.stated import Sections

SUBTRACTED, ADDED = "subtracted", "added"
FEEDBACKS = (SUBTRACTED, ADDED)

MOST_ORDER = 64
"""Of all lists of a longer than a section's together: the exact test of stability takes a second there, minutes beyond."""

ASK = (
    "State --feedback subtracted where y[n] = b0 x[n] + ... - a1 y[n-1] - a2 y[n-2], the sign of the transfer function, or "
    "--feedback added where y[n] = b0 x[n] + ... + a1 y[n-1] + a2 y[n-2]."
)

Make = Callable[[bool], Filter]


def signed(sections: Sections, asked: str | None, make: Make) -> tuple[Filter, bool, tuple[str, ...]]:
    """The filter, whether its feedback was added, and notes. `make` gives the filter of either: make(added).

    RequestError where nothing is asked and stability does not tell.
    """
    if not any(section.is_recursive for section in sections):
        return make(False), False, ()
    if asked is not None:
        chosen = make(asked == ADDED)
        return chosen, asked == ADDED, (f"feedback: {asked}, as asked{_turned(asked)}", *_warning(sections, chosen))
    if not _is_short(sections):
        raise RequestError(f"the feedback is of a higher order than {MOST_ORDER}, too high for its sign to be found by an "
                           f"exact test of stability. {ASK}")
    stable = [(feedback, candidate) for feedback in FEEDBACKS if _is_stable(candidate := make(feedback == ADDED))]
    if len(stable) == 1:
        found, chosen = stable[0]
        other = next(feedback for feedback in FEEDBACKS if feedback != found)
        why = f"found by stability: {other}, the filter would be unstable"
        return chosen, found == ADDED, (f"feedback: {found}, {why}{_turned(found)}",)
    if stable:
        raise RequestError(f"the filter is stable whichever sign its feedback has, so that the file does not tell. {ASK}")
    raise RequestError("the filter is unstable whichever sign its feedback has. If the numbers are other than they were taken "
                       f"for, state --columns; if it is meant to be unstable: {ASK[:1].lower()}{ASK[1:]}")


def _turned(feedback: str) -> str:
    return "; a1, a2 and so on stand in the preset with the other sign" if feedback == ADDED else ""


def _warning(sections: Sections, chosen: Filter) -> tuple[str, ...]:
    if not _is_short(sections):
        return ("stability: not tested, the order is too high",)
    if _is_stable(chosen):
        return ()
    return ("stability: UNSTABLE; nothing runs it until the preset says allow_unstable = true",)


def _is_short(sections: Sections) -> bool:
    orders = [len(section.feedback) for section in sections]
    return sum(order for order in orders if order > 2) <= MOST_ORDER


def _is_stable(candidate: Filter) -> bool:
    return all(is_stable(stripped(exactly(factor.a))) for factor in candidate.factors if isinstance(factor, Polynomials))
