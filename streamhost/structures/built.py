"""From a filter and the names of a structure to a diagram."""

from dataclasses import dataclass

from streamhost.diagram import Diagram
from streamhost.errors import StructureError
from streamhost.filters import Filter
from streamhost.structures import cascade, whole
from streamhost.structures.choices import check_all
from streamhost.structures.division import Division, Sections
from streamhost.structures.form import Form
from streamhost.structures.forms import FORMS
from streamhost.structures.forms import form as form_of
from streamhost.structures.hazards import hazards_of
from streamhost.structures.series import draw


@dataclass(frozen=True)
class Built:
    """A filter as a diagram, and how it came to it.

    Pairing, ordering and scaling are what was done, stated or not. `sections` are as drawn, in order, scaled, without
    trailing zeros; `front` is the gain before the first, None where there is none. `hazards` are sentences.
    """

    diagram: Diagram
    decomposition: str
    form: str
    pairing: str
    ordering: str
    scaling: str
    sections: Sections
    front: float | None
    hazards: tuple[str, ...]


def build(
    filter: Filter, *, form: str, decomposition: str = "cascade", pairing: str | None = None,
    ordering: str | None = None, scaling: str | None = None,
) -> Built:
    """The diagram of a filter in a form.

    A choice of None is not stated: see `cascade.divide` for what is then done. With `whole` there is one section, and
    pairing and ordering make no difference. A filter given as codes is drawn as the cascade it is.
    StructureError where a name is unknown, the filter cannot be divided like that, or the form cannot carry a section.
    """
    drawn_as = form_of(form)
    check_all(decomposition, pairing, ordering, scaling)
    division = _divided(filter, drawn_as, decomposition, pairing, ordering, scaling)
    _check_carried(division, drawn_as)
    return Built(
        draw(division, drawn_as), decomposition, form, division.pairing, division.ordering, division.scaling,
        division.sections, division.front, (*hazards_of(filter, division.sections), *_hazards(division, drawn_as)),
    )


def _check_carried(division: Division, form: Form) -> None:
    ratios = [division.ratio(index) for index in range(len(division.sections))]
    for number, ratio in enumerate(ratios, 1):
        if reason := form.carries(ratio):
            which = "the filter" if division.undivided or len(ratios) == 1 else f"section {number} of {len(ratios)}"
            able = [name for name, other in FORMS.items() if not any(map(other.carries, ratios))]
            raise StructureError(f'form "{form.name}" cannot carry {which}: {reason}. Forms that can: {", ".join(able)}.')


def _hazards(division: Division, form: Form) -> tuple[str, ...]:
    found = [sentence for index in range(len(division.sections)) for sentence in form.hazards(division.ratio(index))]
    return tuple(dict.fromkeys(found))


def _divided(
    filter: Filter, form: Form, decomposition: str, pairing: str | None, ordering: str | None, scaling: str | None
) -> Division:
    if decomposition == "cascade":
        return cascade.divide(filter, form, pairing, ordering, scaling)
    if filter.codes is not None:
        raise StructureError(
            f'decomposition "{decomposition}" multiplies the sections out, and this filter is given as codes of '
            f'{filter.codes.word}, which are kept as they are. Allowed for it is "cascade".'
        )
    return whole.divide(filter, form, scaling)
