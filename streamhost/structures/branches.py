"""Sections in parallel on the page: one below the other, a chain of adders to the right of them."""

from streamhost.diagram import Builder, Ref
from streamhost.diagram.hints import Part as Adder
from streamhost.filters import Polynomials
from streamhost.structures.division import Part
from streamhost.structures.form import Draft, Form, Size, adders, delays_down
from streamhost.structures.forms import direct_1
from streamhost.structures.tiles import GUTTER, Tiles

SUM = 0.75
"""Columns from the sections to the adders."""


class Branches(Tiles):
    """Sections that read one signal and are summed: what is beside them first, if it is not 0, then one after the other.

    What is beside them is a gain, or a finite response in direct form; its coefficients have the number after the last.
    """

    def __init__(self, builder: Builder, part: Part, form: Form, left: float, top: float, first: int) -> None:
        super().__init__(builder, part, form, left, top, first)
        direct = part.division.direct or (0.0,)
        self.beside = Polynomials(direct, (1.0,)) if any(direct) else None
        if self.beside is not None:
            size = Size(direct_1.FORM.width, float(delays_down(self.beside)))
            self.width = max(self.width, size.columns if len(direct) > 1 else 0.0)
            self.sizes = [size, *self.sizes]
        tops = [top]
        for size in self.sizes:
            tops.append(tops[-1] + size.rows + GUTTER)
        self.tops = tops

    @property
    def bottom(self) -> float:
        return self.tops[-1]

    def origin(self, index: int) -> tuple[float, float]:
        return self.left, self.tops[index]

    def right(self, index: int) -> tuple[float, float]:
        """Where the sum leaves: all sections end there."""
        return self.left + self.width + SUM, self.tops[-2] + self.sizes[-1].exit

    def draw(self, signal: Ref) -> Ref:
        sections = self.part.division.sections
        ends: list[Ref] = []
        self.builder.trunk(signal, (self.bus, self.top))
        if self.beside is not None:
            ends.append(self._beside(signal, self.beside, len(sections)))
        for index, section in enumerate(sections):
            number = f"_{index + 1}" if len(sections) + len(ends) > 1 else ""
            origin = self.origin(len(ends))
            if ends:
                self._lead_down(signal, self.tops[len(ends) - 1], origin[1])
            draft = Draft(self.builder, section, self.first + index, f"{self.ending}{number}", origin, self.numbers)
            ends.append(self.form.build_section(draft, signal))
        return self._summed(ends)

    @property
    def bus(self) -> float:
        """The column of the wire that leads down to each section."""
        return self.left - 0.5

    def _lead_down(self, signal: Ref, above: float, row: float) -> None:
        """The wire goes on down the bus, from wherever the section above has led it."""
        column, _ = self.builder.trunk_end(signal)
        if column != self.bus:
            self.builder.trunk(signal, (column, above), (self.bus, above))
        self.builder.trunk(signal, (self.bus, row))

    def _beside(self, signal: Ref, beside: Polynomials, index: int) -> Ref:
        draft = Draft(self.builder, beside, self.first + index, f"{self.ending}_{index + 1}", self.origin(0))
        if len(beside.b) > 1:
            return direct_1.FORM.build_section(draft, signal)
        return draft.b(0, signal, at=(self.width / 2 // 0.125 * 0.125, 0.0))

    def _summed(self, ends: list[Ref]) -> Ref:
        if len(ends) == 1:
            return ends[0]
        column, _ = self.right(0)
        counts = adders([top + size.exit for top, size in zip(self.tops, self.sizes, strict=False)])
        parts = [Adder((column, row), count, "S") for row, count in counts[:-1]]
        row, count = counts[-1]
        total = self.builder.sum(*ends, label=f"y{self.ending}")
        return self.builder.place(total, (column, row), parts=[*parts, Adder((column, row), count)])
