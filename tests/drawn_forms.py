"""Diagrams of forms with drawn coefficients, of any order, and of tapped lines: to be drawn and read back."""

from random import Random

from streamhost.diagram import Builder, Diagram, Sum, minus
from streamhost.filters import Filter
from streamhost.structures import build


def whole(name: str, b_order: int, a_order: int) -> Diagram:
    rng = Random(100 * b_order + a_order)
    b = [rng.uniform(0.1, 1.0) for _ in range(b_order + 1)]
    a = [1.0, *(rng.uniform(0.1, 1.0) / (2 * a_order) for _ in range(a_order))]
    return build(Filter.from_coefficients(b, a, rate=48000), form=name, decomposition="whole").diagram


def cascade(name: str, sections: int, *, odd: bool = False, **choices: str) -> Diagram:
    rng = Random(sections)
    sos = [[1.0, rng.uniform(-1, 1), 0.5, 1.0, rng.uniform(-1, 1), rng.uniform(0.2, 0.9)] for _ in range(sections)]
    if odd:
        sos[-1][2] = sos[-1][5] = 0.0
        sos[-1][4] = 0.3
    filter = Filter.from_sections(sos, rate=48000)
    return build(filter, form=name, decomposition="cascade", pairing="given", **choices).diagram


def sums(diagram: Diagram) -> set[int]:
    return {index for index, node in enumerate(diagram.nodes) if isinstance(node, Sum)}


def tapped(length: int, kind: str) -> Diagram:
    """One tapped line between input and output; its coefficients are so short that every sum of products is exact."""
    rng = Random(length)
    half = [rng.randint(1, 63) / 64 for _ in range((length + 1) // 2)]
    if kind in ("even", "odd"):
        sign = 1 if kind == "even" else -1
        half[-1] *= kind == "even" or length % 2 == 0
        values = half + [sign * c for c in half[: length // 2][::-1]]
    else:
        values = [rng.randint(1, 63) / 64 for _ in range(length)]
    builder = Builder()
    fold = kind if kind in ("even", "odd") else None
    builder.output(builder.taps(builder.input(), "h", values, fold=fold, last_first=kind == "last first"))
    return builder.build()


def complementary() -> Diagram:
    """A low and a high output that add up to a delay."""
    builder = Builder()
    x = builder.input()
    low = builder.taps(x, "h", [0.1, 0.2, 0.4, 0.2, 0.1], fold="even")
    builder.output(low, "low")
    builder.output(builder.sum(builder.delay("d", x, 2), minus(low), label="high"), "high")
    return builder.build()
