"""What a form is, and the pen that every form draws its sections with."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field, replace
from typing import Literal

from streamhost.diagram.builder import Builder, Ref, Signed, minus
from streamhost.diagram.hints import General, Part, Point
from streamhost.diagram.tapped import GAIN_DOWN, MOST_TAPS, SUM_DOWN, Rows, chain, line_rows, summed_rows
from streamhost.filters import Polynomials
from streamhost.structures.division import Ratio, ratio_of

Half = Literal["numerator", "recursion"]

LONG = 64
"""Taps beyond which a line without recursion is drawn as one node rather than as delays, gains and a sum."""


UPRIGHT = 8
"""Taps up to which a line without recursion is drawn downwards, as every other section is."""


def can_lie(section: Polynomials) -> bool:
    """Whether a section is a line without recursion whose taps, alone on a page, are drawn side by side, row under row."""
    return len(section.a) == 1 and UPRIGHT < len(section.b) <= MOST_TAPS


@dataclass(frozen=True)
class Offer:
    """A further output of a form, and where on the page it ends."""

    ref: Ref
    at: Point | None


@dataclass(frozen=True)
class Draft:
    """A section being drawn: its polynomials, its index, and what its labels end with where there are several.

    `origin` is where its first column and row are on the page; places are said from there. `numbers` are written for
    the numbers of the coefficients in a section that stands for a longer one. `ratio` is the section in exact numbers,
    for forms whose coefficients are computed from it. `alone`: nothing else is drawn. Where `all_outputs` says so,
    `offered` collects further outputs by name; else nodes that only they read would reach no output, and a form makes none.
    Nodes are drawn `at` a column and a row of the section; where a form leaves places out, the drawing finds all
    of them.
    """

    builder: Builder
    section: Polynomials
    index: int = 0
    suffix: str = ""
    origin: Point = (0.0, 0.0)
    numbers: tuple[str, ...] = ()
    exact: Ratio | None = None
    alone: bool = False
    all_outputs: bool = False
    offered: dict[str, Offer] = field(default_factory=dict)

    @property
    def ratio(self) -> Ratio:
        return self.exact or ratio_of(self.section)

    def offer(self, name: str, ref: Ref, *, at: Point | None = None) -> None:
        """A further output of the form, which those who ask for all outputs get; `at`: where it ends, to the right."""
        self.offered[name] = Offer(ref, self._on_page(at) if at is not None else None)

    def delay(self, name: str, source: Ref | None = None, *, at: Point | None = None, face: str = "E",
              n: int = 1) -> Ref:
        """A delay of n frames, driven now or later."""
        return self._placed(self.builder.delay(f"{name}{self.suffix}", source, n=n), at, face)

    def gain(self, name: str, value: float, source: Ref, *, at: Point | None = None, face: str = "E",
             part: str = "", feedback: bool = False) -> Ref:
        """The product of a coefficient of the form's own; `feedback`: it is to be subtracted, as an a_k is."""
        label = f"{name}{self.suffix}"
        product = self.builder.gain(source, label, value, section=self.index, part=part, feedback=feedback)
        return self._placed(product, at, face)

    def again(self, gain: Ref, name: str, source: Ref, *, at: Point | None = None, face: str = "E") -> Ref:
        """The product of a coefficient that another gain stores; drawn with the coefficient's name."""
        return self._placed(self.builder.again(gain, source, f"{name}{self.suffix}"), at, face)

    def shift(self, name: str, k: int, source: Ref, *, at: Point | None = None, face: str = "E") -> Ref:
        """2^k of the structure."""
        return self._placed(self.builder.shift(source, k, f"{name}{self.suffix}"), at, face)

    def register(self, name: str, source: Ref, *, at: Point, face: str = "E") -> Ref:
        """A register where the rules give none, drawn as a mark on its wire."""
        return self.builder.place(self.builder.round(source, f"{name}{self.suffix}"), self._on_page(at), face, small=True)

    def residue(self, name: str, register: Ref, *, at: Point, face: str = "S") -> Ref:
        """What the rounding of a register drops."""
        return self._placed(self.builder.residue(register, f"{name}{self.suffix}"), at, face)

    def line(self, name: str, length: int, source: Ref | None = None, *, column: float) -> tuple[Ref, ...]:
        """`length` delays in a row, the first driven by `source`, or later where there is none; drawn downwards."""
        delays: list[Ref] = []
        for k in range(1, length + 1):
            delay = self.builder.delay(f"{name}{k}{self.suffix}", delays[-1] if delays else source)
            delays.append(self._placed(delay, (column, k - 0.5), "S"))
        return tuple(delays)

    def separate(self, name: str, length: int, *, column: float, pitch: float) -> tuple[Ref, ...]:
        """`length` delays that are all driven later, each by a node of its own; drawn upwards."""
        delays = [self.builder.delay(f"{name}{k}{self.suffix}") for k in range(1, length + 1)]
        return tuple(self._placed(delay, (column, (k + 0.5) * pitch), "N") for k, delay in enumerate(delays))

    def b(self, k: int, source: Ref, *, at: Point | None = None, face: str = "E") -> Ref:
        """The product b_k source."""
        label = self._named("b", k)
        return self._placed(self.builder.gain(source, label, self.section.b[k], section=self.index, part="b"), at, face)

    @property
    def lies(self) -> bool:
        """Whether the section is drawn side by side, row under row."""
        return self.alone and can_lie(self.section)

    @property
    def is_long_line(self) -> bool:
        """Whether the section is a tapped delay line so long that it is drawn as one node."""
        return len(self.section.a) == 1 and len(self.section.b) > LONG

    def tapped_line(self, x: Ref) -> Ref:
        """All b_k x[n-k] as one node, added from the last delay up as the gains of a short line are."""
        taps = self.builder.taps(x, "b", self.section.b, last_first=True, section=self.index, part="b")
        return self._placed(taps, (1.5, 0.0))

    def folded_line(self, x: Ref, values: Sequence[float], fold: str) -> Ref:
        """The same of symmetric taps, the two of a pair added before they are multiplied, from the outer pair inwards."""
        return self._placed(self.builder.taps(x, "b", values, fold=fold, section=self.index, part="b"), (1.5, 0.0))

    def line_in_rows(self, name: str, x: Ref) -> Ref:
        """The sum of all b_k x[n-k], its taps side by side, added from the last delay up: the sum runs back to the left."""
        length = len(self.section.b)
        rows, taps = line_rows(length), [x]
        for k in range(1, length):
            self.lead_on(rows, taps[-1], k, 0, 0.0)
            delay = self.builder.delay(f"{name}{k}{self.suffix}", taps[-1])
            taps.append(self._placed(delay, rows.at(k, 0.0, -rows.pitch / 2)))
        order = list(reversed(range(length)))
        products = [self.b(k, taps[k], at=rows.at(k, GAIN_DOWN), face="S") for k in order]
        parts = [replace(part, at=self._on_page(part.at), way=tuple(map(self._on_page, part.way)))
                 for part in chain(rows, order, 1, SUM_DOWN)]
        return self._summed("y", products, parts)

    def sums_in_rows(self, delay: str, name: str, x: Ref) -> Ref:
        """The same with x over all gains and the delays between sums, the last tap first: the sum runs to the right."""
        last = len(self.section.b) - 1
        rows = summed_rows(last + 1)
        delays = [self.builder.delay(f"{delay}{k}{self.suffix}") for k in range(1, last + 1)]
        for k, ref in enumerate(delays, 1):
            self._placed(ref, rows.at(last + 1 - k, SUM_DOWN, 0.875 - rows.pitch))
        for tap in range(rows.a_row, last + 1, rows.a_row):
            self.lead_on(rows, x, tap, 0, 0.0)
        self.trunk(x, rows.at(last))
        result: Ref | None = None
        for k in range(last + 1):
            tap = last - k
            terms = [self.b(k, x, at=rows.at(tap, GAIN_DOWN), face="S"), *delays[k : k + 1]]
            s = self.add(f"{name}{k}" if k else "y", terms, at=rows.at(tap, SUM_DOWN))
            result = result or s
            self.lead_on(rows, s, tap + 1, 1, SUM_DOWN)
            if k:
                delays[k - 1].takes(s)
        assert result is not None, "a section has a coefficient"
        return result

    def lead_on(self, rows: Rows, source: Ref, tap: int, lane: int, down: float) -> None:
        """The wire out of a node goes on in the row of a tap, if that begins one."""
        if rows.begins_a_row(tap) and tap < len(self.section.b):
            self.trunk(source, *rows.way(tap, lane, down))

    def a(self, k: int, source: Ref, *, at: Point | None = None) -> Signed:
        """The product a_k source, to be subtracted."""
        label = self._named("a", k)
        product = self.builder.gain(source, label, self.section.a[k], section=self.index, part="a", feedback=True)
        return minus(self._placed(product, at, "W"))

    def add(self, name: str, terms: Sequence[Ref | Signed], *, at: Point | None = None, face: str = "E") -> Ref:
        """The sum of the terms in their order, drawn as one adder. One term alone is no sum, unless it is subtracted."""
        return self._summed(name, terms, [Part(self._on_page(at), len(terms), face)] if at is not None else [])

    def climb(self, name: str, terms: Sequence[Ref | Signed], *, column: float, rows: Sequence[float]) -> Ref:
        """The same, drawn as a chain of adders upwards: each term enters at its row, the last leaves to the right."""
        counts = adders(rows)
        parts = [Part(self._on_page((column, row)), count, "N") for row, count in counts[:-1]]
        row, count = counts[-1]
        return self._summed(name, terms, [*parts, Part(self._on_page((column, row)), count)])

    def stride(self, name: str, terms: Sequence[Ref | Signed], *, columns: Sequence[float], row: float) -> Ref:
        """The same, drawn as a chain of adders to the right: each term enters at its column."""
        parts = [Part(self._on_page((column, row)), count) for column, count in adders(columns)]
        return self._summed(name, terms, parts)

    def chain(self, name: str, terms: Sequence[Ref | Signed], *, at: Sequence[Point], face: str = "E", last: str = "",
              grow: int | None = None) -> Ref:
        """The same, drawn as a chain of adders at those places: two terms enter the first, one each of the others.

        `last`: the face of the last one, if it is another. `grow` marks a register so many bits longer than the signal,
        which wraps.
        """
        faces = [*[face] * (len(at) - 1), last or face]
        parts = [Part(self._on_page(point), 1 + (k == 0), side) for k, (point, side) in enumerate(zip(at, faces, strict=False))]
        return self._summed(name, terms, parts, grow)

    def trunk(self, source: Ref, *points: Point) -> None:
        """The wire out of a node runs along these points before it branches."""
        self.builder.trunk(source, *map(self._on_page, points))

    def _summed(self, name: str, terms: Sequence[Ref | Signed], parts: Sequence[Part], grow: int | None = None) -> Ref:
        if len(terms) == 1 and isinstance(terms[0], Ref):
            return terms[0]
        total = self.builder.sum(*terms, label=f"{name}{self.suffix}", grow=grow)
        if not parts:
            return total
        return self.builder.place(total, parts[-1].at, parts[-1].face, parts=parts if len(parts) > 1 else ())

    def _named(self, letter: str, k: int) -> str:
        return f"{letter}{self.numbers[k] if self.numbers else k}{self.suffix}"

    def _placed(self, ref: Ref, at: Point | None, face: str = "E") -> Ref:
        if at is None:
            return ref
        return self.builder.place(ref, self._on_page(at), face)

    def _on_page(self, point: Point) -> Point:
        return self.origin[0] + point[0], self.origin[1] + point[1]


def adders(places: Sequence[float]) -> list[tuple[float, int]]:
    """(place, how many terms enter there) of each adder of a chain; a first term alone joins at the place after it."""
    found: list[tuple[float, int]] = []
    for place in places:
        if found and (found[-1][0] == place or (len(found) == 1 and found[0][1] == 1)):
            found[-1] = (place, found[-1][1] + 1)
        else:
            found.append((place, 1))
    return found


def delays_down(section: Polynomials) -> int:
    """How many delays a section of the direct forms has below each other."""
    return max(len(section.a), len(section.b)) - 1


@dataclass(frozen=True)
class Size:
    """What a drawn section takes: columns, rows, and the row at which its output leaves on the right."""

    columns: float
    rows: float
    exit: float = 0.0


@dataclass(frozen=True)
class Form:
    """One way to draw a section, or a whole filter, of any order.

    `build_section` takes a draft and the section's input and returns the section's output; the order in which it
    creates nodes is the order in which ready nodes are evaluated. `begins_with` says which half the signal meets
    first, which is what scaling must know: "numerator" where the point to scale is the section's output. `docs` explains
    the form to a user.

    `carries` says in words why a section cannot be drawn in this form, "" where it can. `hazards` are sentences about a
    section that is drawn and is dangerous. Drawn, a section is `width` columns wide and has `pitch` rows for each delay,
    its output leaving at the top right, unless `size` says otherwise, or `exact_size` where that follows from what only the
    exact numbers tell. `general` is what stands for a section that is too
    long to be drawn, None where it is not. `origin` is the file of a user's own form.
    """

    name: str
    summary: str
    begins_with: Half
    build_section: Callable[[Draft, Ref], Ref]
    docs: str = ""
    width: float = 4.0
    pitch: float = 1.0
    carries: Callable[[Ratio], str] = lambda ratio: ""
    hazards: Callable[[Ratio], tuple[str, ...]] = lambda ratio: ()
    size: Callable[[Polynomials], Size] | None = None
    exact_size: Callable[[Ratio], Size] | None = None
    general: Callable[[Polynomials], General | None] = lambda section: None
    origin: str = ""

    @property
    def has_size(self) -> bool:
        """Whether a section's size follows from more than its delays."""
        return self.size is not None or self.exact_size is not None

    def size_of(self, section: Polynomials, ratio: Ratio | None = None) -> Size:
        """What the section takes on the page; `ratio`: the same in exact numbers."""
        if self.exact_size is not None:
            return self.exact_size(ratio or ratio_of(section))
        return self.size(section) if self.size else Size(self.width, self.pitch * delays_down(section))
