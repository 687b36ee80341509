"""What a form is, and the pen that every form draws its sections with."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Literal

from streamhost.diagram.builder import Builder, Ref, Signed, minus
from streamhost.filters import Polynomials

Half = Literal["numerator", "recursion"]

LONG = 64
"""Taps beyond which a line without recursion is drawn as one node rather than as delays, gains and a sum."""


@dataclass(frozen=True)
class Draft:
    """A section being drawn: its polynomials, its index, and what its labels end with where there are several."""

    builder: Builder
    section: Polynomials
    index: int = 0
    suffix: str = ""

    def line(self, name: str, length: int, source: Ref | None = None) -> tuple[Ref, ...]:
        """`length` delays in a row, the first driven by `source`, or later where there is none."""
        delays: list[Ref] = []
        for k in range(1, length + 1):
            delays.append(self.builder.delay(f"{name}{k}{self.suffix}", delays[-1] if delays else source))
        return tuple(delays)

    def separate(self, name: str, length: int) -> tuple[Ref, ...]:
        """`length` delays that are all driven later, each by a node of its own."""
        return tuple(self.builder.delay(f"{name}{k}{self.suffix}") for k in range(1, length + 1))

    def b(self, k: int, source: Ref) -> Ref:
        """The product b_k source."""
        label = f"b{k}{self.suffix}"
        return self.builder.gain(source, label, self.section.b[k], section=self.index, part="b")

    @property
    def is_long_line(self) -> bool:
        """Whether the section is a tapped delay line so long that it is drawn as one node."""
        return len(self.section.a) == 1 and len(self.section.b) > LONG

    def tapped_line(self, x: Ref) -> Ref:
        """All b_k x[n-k] as one node, added from the last delay up as the gains of a short line are."""
        return self.builder.taps(x, "b", self.section.b, last_first=True, section=self.index, part="b")

    def a(self, k: int, source: Ref) -> Signed:
        """The product a_k source, to be subtracted."""
        label = f"a{k}{self.suffix}"
        product = self.builder.gain(source, label, self.section.a[k], section=self.index, part="a", feedback=True)
        return minus(product)

    def add(self, name: str, terms: Sequence[Ref | Signed]) -> Ref:
        """The sum of the terms in their order. One term alone is no sum, unless it is subtracted."""
        if len(terms) == 1 and isinstance(terms[0], Ref):
            return terms[0]
        return self.builder.sum(*terms, label=f"{name}{self.suffix}")


@dataclass(frozen=True)
class Form:
    """One way to draw a section, or a whole filter, of any order.

    `build_section` takes a draft and the section's input and returns the section's output; the order in which it
    creates nodes is the order in which ready nodes are evaluated. `begins_with` says which half the signal meets
    first, which is what scaling must know. `docs` explains the form to a user.
    """

    name: str
    summary: str
    begins_with: Half
    build_section: Callable[[Draft, Ref], Ref]
    docs: str
