"""Legal random diagrams with one input and all nine kinds of node, for tests that hold of every diagram.

`random_diagram(random.Random(7), 30)` is one diagram; `diagrams()` is a hypothesis strategy that shrinks.
Residues are taken of registers only (a `round`, or a sum that a delay reads) and reach sums through gains; a
coefficient marked as feedback is read by one sum, which subtracts it: what forms do, and what every format can carry.
"""

from dataclasses import dataclass, field
from random import Random

import numpy as np
from hypothesis import strategies as st

from streamhost.diagram import Builder, Diagram, Ref, minus
from streamhost.diagram.linear import propagate

KINDS = ("delay", "gain", "shift", "sum", "taps", "round", "residue", "mark", "loop")
COARSE = 2.0**-6


def random_diagram(rng: Random, nodes: int = 24, *, kinds: tuple[str, ...] = KINDS, channels: int = 1,
                   step: float | None = None, outputs: int = 3, stable: bool = True) -> Diagram:
    """A legal diagram of about `nodes` nodes and 1 to `outputs` outputs.

    kinds: what may be drawn besides inputs and outputs; "mark" is a sum with `grow`, "loop" a section that feeds back,
    with error feedback where "residue" may be drawn too. step: every coefficient is a multiple of it within (-2, 2).
    stable: recursive coefficients are halved until every pole lies within radius 0.98; else they are left as drawn.
    """
    plan = _Plan(rng, kinds, channels, step)
    while len(plan.pool) + len(plan.hidden) < nodes:
        _GROW[rng.choice(kinds)](plan)
    for delay in plan.open:
        delay.takes(plan.gain(plan.pick(), "loop", 0.5))
    _add_outputs(plan, rng.randint(1, outputs))
    diagram = plan.builder.build()
    return _stabilized(diagram, step) if stable else diagram


def diagrams(*, min_nodes: int = 3, max_nodes: int = 30, **options: object) -> st.SearchStrategy[Diagram]:
    """Hypothesis: `random_diagram` with its options, on a generator whose choices shrink."""
    return st.builds(lambda rng, nodes: random_diagram(rng, nodes, **options),  # type: ignore[arg-type]
                     st.randoms(use_true_random=False), st.integers(min_nodes, max_nodes))


@dataclass
class _Plan:
    """A diagram under construction: `pool` may be read by anything, `hidden` only by what was made for it."""

    rng: Random
    kinds: tuple[str, ...]
    channels: int
    step: float | None
    builder: Builder = field(default_factory=Builder)
    pool: list[Ref] = field(default_factory=list)
    hidden: list[Ref] = field(default_factory=list)
    open: list[Ref] = field(default_factory=list)
    sections: int = 0

    def __post_init__(self) -> None:
        self.pool.append(self.builder.input())
        if "loop" in self.kinds and "delay" in self.kinds:
            self.open = [self.keep(self.builder.delay("first", n=self.rng.randint(1, 3))) for _ in range(2)]

    def keep(self, ref: Ref) -> Ref:
        self.pool.append(ref)
        return ref

    def hide(self, ref: Ref) -> Ref:
        self.hidden.append(ref)
        return ref

    def pick(self) -> Ref:
        """A value to read; late ones oftener, so that diagrams grow deep as well as wide."""
        late = self.pool[-6:]
        return self.rng.choice(late if self.rng.random() < 0.7 else self.pool)

    def coefficients(self, size: float = 1.0) -> list[float]:
        return [self._coefficient(size) for _ in range(self.channels)]

    def gain(self, source: Ref, label: str, size: float = 1.0, **slot: object) -> Ref:
        return self.hide(self.builder.gain(source, label, self.coefficients(size), **slot))  # type: ignore[arg-type]

    def _coefficient(self, size: float) -> float:
        if self.rng.random() < 0.1:
            return self.rng.choice((0.0, 1.0, -1.0)) if size >= 1.0 else 0.0
        if self.step is None:
            return self.rng.randint(-(2**20), 2**20) * 2.0**-20 * 1.9 * size
        most = round(2 / self.step) - 1
        return self.step * int(self.rng.randint(-most, most) * size)


def _delay(plan: _Plan) -> None:
    plan.keep(plan.builder.delay("", plan.pick(), plan.rng.randint(1, 4)))


def _gain(plan: _Plan) -> None:
    plan.keep(plan.builder.gain(plan.pick(), "g", plan.coefficients(), section=plan.rng.choice((None, 0, 1))))


def _shift(plan: _Plan) -> None:
    plan.keep(plan.builder.shift(plan.pick(), plan.rng.randint(-3, 2)))


def _sum(plan: _Plan, grow: int | None = None) -> None:
    terms = [plan.pick() for _ in range(plan.rng.randint(1, 4))]
    plan.keep(plan.builder.sum(*(minus(t) if plan.rng.random() < 0.4 else t for t in terms), grow=grow))


def _mark(plan: _Plan) -> None:
    _sum(plan, plan.rng.randint(0, 8))


def _taps(plan: _Plan) -> None:
    length, fold = plan.rng.randint(1, 7), plan.rng.choice((None, "even", "odd"))
    half = [plan.coefficients(0.5) for _ in range((length + 1) // 2)]
    if fold is None:
        values = half + [plan.coefficients(0.5) for _ in range(length // 2)]
    else:
        sign = 1.0 if fold == "even" else -1.0
        if fold == "odd" and length % 2:
            half[-1] = [0.0] * plan.channels
        values = half + [[sign * c for c in half[i]] for i in reversed(range(length // 2))]
    if length == 1 and fold == "odd":
        fold = None
    last_first = fold is None and plan.rng.random() < 0.3
    plan.keep(plan.builder.taps(plan.pick(), "t", values, fold=fold, last_first=last_first))


def _round(plan: _Plan) -> None:
    plan.keep(plan.builder.round(plan.pick()))


def _residue(plan: _Plan) -> None:
    register = plan.keep(plan.builder.round(plan.pick()))
    error = plan.hide(plan.builder.residue(register))
    if "delay" in plan.kinds and plan.rng.random() < 0.5:
        error = plan.hide(plan.builder.delay("e", error, plan.rng.randint(1, 2)))
    plan.keep(plan.builder.sum(plan.pick(), minus(plan.gain(error, "c"))))


def _loop(plan: _Plan) -> None:
    """y = x - a1 y[n-1] - a2 y[n-k], with or without error feedback."""
    builder, section = plan.builder, plan.sections
    plan.sections += 1
    d1, d2 = builder.delay("y1"), builder.delay("y2", n=plan.rng.randint(1, 3))
    terms = [minus(plan.gain(d, f"a{i}", 0.4, section=section, part="a", feedback=True)) for i, d in ((1, d1), (2, d2))]
    error = None
    if "residue" in plan.kinds and plan.rng.random() < 0.5:
        error = plan.hide(builder.delay("e1"))
        terms.append(minus(plan.gain(error, "c1", section=section, part="c")))
    y = builder.sum(plan.pick(), *terms, label="y")
    d1.takes(y)
    d2.takes(plan.rng.choice((d1, y)))
    if error is not None:
        error.takes(plan.hide(builder.residue(y)))
    for ref in (d1, d2, y):
        plan.keep(ref)


_GROW = {"delay": _delay, "gain": _gain, "shift": _shift, "sum": _sum, "taps": _taps, "round": _round,
         "residue": _residue, "mark": _mark, "loop": _loop}


def _add_outputs(plan: _Plan, outputs: int) -> None:
    """Every value that would reach no output is shared out among them."""
    ends: list[list[Ref]] = [[] for _ in range(outputs)]
    for i, ref in enumerate(_loose_ends(plan)):
        ends[i % outputs].append(ref)
    for i, refs in enumerate(ends):
        refs = refs or [plan.pool[-1]]
        plan.builder.output(refs[0] if len(refs) == 1 else plan.builder.sum(*refs, label="out"), f"y{i}")


def _loose_ends(plan: _Plan) -> list[Ref]:
    nodes = plan.builder.build(check=False).nodes
    ends: list[Ref] = []
    reached: set[int] = set()
    readable = {ref.index: ref for ref in plan.pool}
    for index in sorted(readable, reverse=True):
        if index in reached:
            continue
        ends.append(readable[index])
        todo = [index]
        while todo:
            reached.add(todo[-1])
            todo.extend(s for s in nodes[todo.pop()].reads if s not in reached)
    return ends


def _stabilized(diagram: Diagram, step: float | None) -> Diagram:
    recursive = np.array([slot.feedback or slot.label == "loop" for slot in diagram.slots], dtype=bool)
    values = diagram.values.copy()
    while max(_radius(diagram.with_values(values), channel) for channel in range(diagram.channels)) > 0.98:
        values[recursive] /= 2
        if step is not None:
            values[recursive] = np.trunc(values[recursive] / step) * step
    return diagram.with_values(values)


def _radius(diagram: Diagram, channel: int) -> float:
    return float(max(abs(np.linalg.eigvals(propagate(diagram, channel).A)), default=0.0))
