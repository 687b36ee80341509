"""Filters that differ from channel to channel as one diagram: the graph is one, and each channel has its coefficients.

Every channel is divided by itself. Where one has fewer sections than another, wires stand for those it lacks, sections
with b = 1, 0, 0 and a = 1, 0, 0; where a section is shorter, it is filled up with zeros. Such coefficients are stored and
multiplied with as all others are.
"""

from collections.abc import Sequence
from dataclasses import replace
from fractions import Fraction

import numpy as np

from streamhost.diagram import Diagram
from streamhost.errors import StructureError
from streamhost.filters import Polynomials
from streamhost.structures.division import Division, Part, Parts, Ratio
from streamhost.structures.form import Form
from streamhost.structures.series import draw

WIRE = Polynomials((1.0,), (1.0,))
NOTHING = Polynomials((0.0,), (1.0,))


def draw_channels(channels: Sequence[Parts], form: Form) -> Diagram:
    """The diagram of one channel or of several, which have the same outputs.

    StructureError where a form draws the channels' sections as different graphs, although they are of equal lengths.
    """
    if len(channels) == 1:
        return draw(channels[0], form)
    shaped = of_one_shape(channels)
    _check_carried(shaped, form)
    first, *others = (draw(parts, form) for parts in shaped)
    for number, other in enumerate(others, 2):
        if other.hash != first.hash:
            raise StructureError(
                f'form "{form.name}" draws the filter of channel {number} as another graph than that of channel 1, and all '
                "channels run through one. The direct and transposed forms draw all sections of one length alike."
            )
    return first.with_values(np.hstack([first.values, *(other.values for other in others)]))


def _check_carried(channels: Sequence[Parts], form: Form) -> None:
    for number, parts in enumerate(channels, 1):
        for division in (part.division for part in parts):
            for index in range(len(division.sections)):
                if reason := form.carries(division.ratio(index)):
                    raise StructureError(
                        f'form "{form.name}" cannot carry a section of channel {number} at the length that it has in '
                        f"another channel: {reason}. The direct and transposed forms draw all sections of one length alike."
                    )


def of_one_shape(channels: Sequence[Parts]) -> list[Parts]:
    """The parts of each channel with as many sections, and as many coefficients in each, as any of the channels has.

    A part that one channel lacks is a wire in the others' place.
    """
    names = sorted(dict.fromkeys(part.name for parts in channels for part in parts), key=bool)
    kept = [{part.name: part.division for part in parts} for parts in channels]
    columns = [_alike([divisions.get(name) or _wire_beside(kept, name) for divisions in kept]) for name in names]
    return [tuple(map(Part, names, row)) for row in zip(*columns, strict=True)]


def _wire_beside(kept: Sequence[dict[str, Division]], name: str) -> Division:
    """A part that lets pass, in series or in parallel as the others of its name are."""
    others = [divisions[name] for divisions in kept if name in divisions]
    if others[0].direct is not None:
        return Division((NOTHING,), None, "given", "given", "none", direct=(1.0,))
    return Division((WIRE,), None, "given", "given", "none")


def _alike(divisions: Sequence[Division]) -> list[Division]:
    if any(division.shifts for division in divisions):
        raise StructureError(
            f'scaling "{divisions[0].scaling}" makes powers of two that belong to the graph, and channels whose filters '
            "differ run through one graph. Allowed for them are the scalings that change coefficients."
        )
    count = max(len(division.sections) for division in divisions)
    beside = max(len(division.direct or ()) for division in divisions)
    lacking = WIRE if not beside else NOTHING
    filled = [(*division.sections, *[lacking] * (count - len(division.sections))) for division in divisions]
    lengths = [(max(len(s.b) for s in place), max(len(s.a) for s in place)) for place in zip(*filled, strict=True)]
    fronts = any(division.front is not None for division in divisions)
    return [
        replace(
            division,
            sections=tuple(Polynomials(_longer(s.b, b), _longer(s.a, a)) for s, (b, a) in zip(sections, lengths, strict=True)),
            front=1.0 if fronts and division.front is None else division.front,
            undivided=_longer_ratio(division.undivided, *lengths[0]),
            direct=_longer(division.direct, beside) if division.direct is not None else None,
        )
        for division, sections in zip(divisions, filled, strict=True)
    ]


def _longer(coefficients: tuple[float, ...], length: int) -> tuple[float, ...]:
    return coefficients + (0.0,) * (length - len(coefficients))


def _longer_ratio(ratio: Ratio | None, b: int, a: int) -> Ratio | None:
    if ratio is None:
        return None
    zero = (Fraction(0),)
    return Ratio(ratio.b + zero * (b - len(ratio.b)), ratio.a + zero * (a - len(ratio.a)))
