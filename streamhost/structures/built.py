"""From a filter and the names of a structure to a diagram."""

from collections.abc import Sequence
from dataclasses import dataclass, replace

from streamhost.diagram import Diagram
from streamhost.errors import StructureError
from streamhost.filters import Filter
from streamhost.structures import cascade, parallel, whole
from streamhost.structures.channels import draw_channels
from streamhost.structures.choices import check_all
from streamhost.structures.division import Division, Part, Parts, Sections
from streamhost.structures.form import Form
from streamhost.structures.forms import FORMS
from streamhost.structures.forms import form as form_of
from streamhost.structures.hazards import hazards_of


@dataclass(frozen=True)
class Built:
    """A filter as a diagram, and how it came to it.

    `channels`: how the filter of each channel was divided, scaled, without trailing zeros; one where all are alike.
    `hazards` are sentences. Pairing, ordering and scaling are what was done, stated or not.
    """

    diagram: Diagram
    decomposition: str
    form: str
    channels: tuple[Parts, ...]
    hazards: tuple[str, ...]

    @property
    def sections(self) -> Sections:
        """Of the first channel, in the order in which they are drawn."""
        return tuple(section for part in self.channels[0] for section in part.division.sections)

    @property
    def front(self) -> float | None:
        """The gain before the first section of the first channel; None where there is none."""
        return self._first.front

    @property
    def pairing(self) -> str:
        return self._first.pairing

    @property
    def ordering(self) -> str:
        return self._first.ordering

    @property
    def scaling(self) -> str:
        return self._first.scaling

    @property
    def _first(self) -> Division:
        return self.channels[0][0].division


def build(
    filter: Filter | Sequence[Filter], *, form: str, decomposition: str = "cascade", pairing: str | None = None,
    ordering: str | None = None, scaling: str | None = None, outputs: str | None = None,
) -> Built:
    """The diagram of a filter in a form; of a sequence, a filter for each channel, all with the same outputs.

    A choice of None is not stated: see `cascade.divide` for what is then done. With `whole` there is one section, and
    pairing and ordering make no difference. A filter given as codes is drawn as the cascade it is. What all outputs have
    in common, and what leads to each of them, is divided and scaled apart, each as if it stood alone. `outputs` "all" adds
    those that a form offers beside the filter's own, of a filter that is one section.
    StructureError where a name is unknown, the filter cannot be divided like that, or the form cannot carry a section.
    """
    drawn_as = form_of(form)
    check_all(decomposition, pairing, ordering, scaling, outputs)
    channels: list[Parts] = []
    hazards: list[str] = []
    for each in (filter,) if isinstance(filter, Filter) else filter:
        pieces = [(name, piece, _divided(piece, drawn_as, decomposition, pairing, ordering, scaling))
                  for name, piece in _pieces(each)]
        for name, piece, division in pieces:
            _check_carried(division, drawn_as, name)
            hazards += [*hazards_of(piece, division.sections), *_hazards(division, drawn_as)]
        channels.append(tuple(Part(name, division) for name, _, division in pieces))
    if outputs == "all":
        channels = [_with_all_outputs(parts, form) for parts in channels]
    diagram = draw_channels(channels, drawn_as)
    if outputs == "all" and len(diagram.outputs) == 1:
        raise StructureError(f'outputs "all" asks for more than the filter, and form "{form}" offers none. Allowed is "main".')
    return Built(diagram, decomposition, form, tuple(channels), tuple(dict.fromkeys(hazards)))


def _with_all_outputs(parts: Parts, form: str) -> Parts:
    if len(parts) > 1 or len(parts[0].division.sections) > 1 or parts[0].division.direct is not None:
        raise StructureError(
            f'outputs "all" asks for those that form "{form}" has inside, and this filter is more than one section. Allowed '
            'for it is "main"; with decomposition "whole" a filter is one section.'
        )
    return (Part(parts[0].name, replace(parts[0].division, all_outputs=True)),)


def _pieces(filter: Filter) -> list[tuple[str, Filter]]:
    """What all outputs have in common, unless that is nothing, and what leads to each of several."""
    common = [("", filter.common)] if filter.factors else []
    return [*common, *((branch.name, branch.filter) for branch in filter.branches)]


def _check_carried(division: Division, form: Form, output: str) -> None:
    ratios = [division.ratio(index) for index in range(len(division.sections))]
    for number, ratio in enumerate(ratios, 1):
        if reason := form.carries(ratio):
            which = "the filter" if division.undivided or len(ratios) == 1 else f"section {number} of {len(ratios)}"
            where = f'{which} to the output "{output}"' if output else which
            able = [name for name, other in FORMS.items() if not any(map(other.carries, ratios))]
            said = f'form "{form.name}" cannot carry {where}: {reason}. Forms that can: {", ".join(able)}.'
            raise StructureError(said, reason)


def _hazards(division: Division, form: Form) -> tuple[str, ...]:
    found = [sentence for index in range(len(division.sections)) for sentence in form.hazards(division.ratio(index))]
    return tuple(found)


def _divided(
    filter: Filter, form: Form, decomposition: str, pairing: str | None, ordering: str | None, scaling: str | None
) -> Division:
    if decomposition == "cascade":
        return cascade.divide(filter, form, pairing, ordering, scaling)
    if filter.codes is not None:
        raise StructureError(
            f'decomposition "{decomposition}" changes the sections, and this filter is given as codes of '
            f'{filter.codes.word}, which are kept as they are. Allowed for it is "cascade".'
        )
    if decomposition == "parallel":
        return parallel.divide(filter, pairing, ordering, scaling)
    return whole.divide(filter, form, scaling)
