"""A cascade of sections of first and second order: kept as given, or paired, ordered and scaled."""

from streamhost.errors import StructureError
from streamhost.filters import Filter, Polynomials
from streamhost.filters.exact import exactly
from streamhost.filters.stability import is_stable
from streamhost.structures.division import Division, Sections, all_trimmed
from streamhost.structures.form import Form
from streamhost.structures.ordering import arranged
from streamhost.structures.pairing import nearest_pairs
from streamhost.structures.quietest import Order, quietest
from streamhost.structures.scaling import Scaled, by_norms, has_norms, rescaled, spread, taken_out

# Beyond this the roots of one polynomial take minutes.
MOST_ORDER = 128


def divide(filter: Filter, form: Form, pairing: str | None, ordering: str | None, scaling: str | None) -> Division:
    """The sections of a filter, the names known and checked.

    A filter given as sections keeps what is not stated: its sections as they are, or, with an ordering stated, the same
    sections in another order, or, with a scaling stated, the same sections with other gains. Only a stated pairing
    `nearest` takes them apart. Other filters are paired `nearest`, ordered `outward` and scaled `none` unless stated.

    StructureError where the filter cannot be divided like that.
    """
    if filter.codes is not None:
        _check_codes(filter.codes.word, pairing, ordering, scaling)
    pairing = pairing or ("given" if filter.sections_given else "nearest")
    if pairing == "given":
        return _kept(filter, form, ordering or "given", scaling or "none")
    return _paired(filter, form, ordering or "outward", scaling or "none")


def _kept(filter: Filter, form: Form, ordering: str, scaling: str) -> Division:
    if not filter.sections_given:
        raise StructureError(
            f'pairing "given" keeps the sections that a filter is given as, and this one, of order {filter.order}, was '
            'not given as sections of first and second order. Allowed for it is "nearest".'
        )
    kept = all_trimmed(filter.sections())
    if ordering == "quietest":
        kept = arranged(kept, "outward")
        kept = _rearranged(kept, _quietest(*(taken_out(kept) if has_norms(scaling) else (kept, 1.0)), scaling, form))
    else:
        kept = arranged(kept, ordering)
    return _division(rescaled(kept, scaling, form.begins_with), "given", ordering, scaling)


def _paired(filter: Filter, form: Form, ordering: str, scaling: str) -> Division:
    if ordering == "given":
        raise StructureError(
            'ordering "given" keeps the order that sections were given in, and pairing "nearest" makes new ones. '
            'Allowed with it are "outward", "inward" and "quietest".'
        )
    check_order(filter)
    solved = filter.zeros_poles()
    inward = all_trimmed(nearest_pairs(solved))
    monic = inward if ordering == "inward" else inward[::-1]
    if ordering == "quietest":
        weighed = (monic, solved.gain) if has_norms(scaling) else (spread(monic, solved.gain), 1.0)
        monic = _rearranged(monic, _quietest(*weighed, scaling, form))
    if has_norms(scaling):
        return _division(by_norms(monic, solved.gain, scaling, form.begins_with), "nearest", ordering, scaling)
    return _division(rescaled(spread(monic, solved.gain), scaling, form.begins_with), "nearest", ordering, scaling)


def _quietest(outward: Sections, gain: float, scaling: str, form: Form) -> Order:
    if not all(is_stable(exactly(section.a)) for section in outward):
        raise StructureError(
            'ordering "quietest" weighs the noise behind each section, and this filter has a section with a pole on or '
            'outside the unit circle, behind which it grows for ever. Allowed for it are "outward" and "inward".'
        )
    return quietest(outward, gain, scaling, form.begins_with)


def _rearranged(sections: Sections, order: Order) -> Sections:
    return tuple(sections[place] for place in order)


def _division(scaled: Scaled, pairing: str, ordering: str, scaling: str) -> Division:
    return Division(scaled.sections, scaled.front, pairing, ordering, scaling, shifts=scaled.shifts)


def _check_codes(word: str, pairing: str | None, ordering: str | None, scaling: str | None) -> None:
    rules = (("pairing", pairing, "given"), ("ordering", ordering, "given"), ("scaling", scaling, "none"))
    for what, stated, allowed in rules:
        if stated not in (None, allowed):
            raise StructureError(
                f'{what} "{stated}" changes the sections of a filter, and this one is given as codes of {word}, which '
                f'are kept as they are. Allowed for it is "{allowed}".'
            )


def check_order(filter: Filter) -> None:
    """StructureError where the roots of a polynomial would take minutes to find."""
    for factor in filter.factors:
        if isinstance(factor, Polynomials) and max(len(factor.b), len(factor.a)) > MOST_ORDER + 1:
            order = max(len(factor.b), len(factor.a)) - 1
            raise StructureError(
                f"dividing a filter needs its roots, and this one is given as polynomials of order {order}; up to "
                f'{MOST_ORDER} can be solved. Draw it with decomposition "whole", or give it as sections or as zeros '
                "and poles."
            )
