"""Random filters, structures, formats and signals for the comparison with the second evaluator."""

from collections.abc import Callable
from dataclasses import dataclass
from random import Random
from typing import Any

import numpy as np
from oracle import FORMS
from oracle_fixed import Section
from oracle_words import Format

import streamhost as sh
from streamhost.errors import StructureError
from streamhost.structures import Built, build

ROUNDINGS = ("half-up", "half-even", "half-away", "floor", "toward-zero")
OVERFLOWS = ("saturate", "wrap")
POINTS = ("section", "polynomial", "realization", "coefficient")
RATE = 48000


@dataclass(frozen=True)
class Case:
    """What is realized, and the keywords of its format. `built` gives the sections as drawn and the gain in front."""

    filter: sh.Filter
    built: Built
    scaling: str | None
    keys: dict[str, Any]

    @property
    def sections(self) -> list[Section]:
        return [(list(section.b), list(section.a)) for section in self.built.sections]

    def realize(self, make: Callable[..., Any]) -> sh.Realization:
        return sh.realize(
            self.filter, form=self.built.form, decomposition=self.built.decomposition, scaling=self.scaling,
            format=make(**self.keys), allow_unstable=True,
        )

    def __str__(self) -> str:
        orders = [(len(b) - 1, len(a) - 1) for b, a in self.sections]
        return f"{self.built.form} {self.built.decomposition} orders {orders} front {self.built.front} {self.keys}"


def fixed_case(rng: Random) -> Case:
    return Case(*structure(rng), fixed_keys(rng))


def float_case(rng: Random) -> Case:
    type = rng.choice(["float32", "float64"])
    keys = {"type": type, "accumulator": rng.choice([None, "float64"]), "fused": rng.random() < 0.5,
            "flush_subnormals": rng.random() < 0.5}
    return Case(*structure(rng), keys)


# --- filters


def structure(rng: Random, form: str | None = None) -> tuple[sh.Filter, Built, str | None]:
    """A filter of order 0 to 5, whole, or of one to three sections in cascade; some scaled, with a gain in front."""
    form = form or rng.choice(list(FORMS))
    if rng.random() < 0.5:
        rows = [section(rng, 2) for _ in range(rng.randint(1, 3))]
        table = [[*(b + [0.0, 0.0])[:3], *(a + [0.0, 0.0])[:3]] for b, a in rows]
        filter, decomposition = sh.Filter.from_sections(table, rate=RATE), "cascade"
    else:
        filter, decomposition = sh.Filter.from_coefficients(*section(rng, 5), rate=RATE), "whole"
    scaling = "l2" if rng.random() < 0.2 else None
    try:
        return filter, build(filter, form=form, decomposition=decomposition, scaling=scaling), scaling
    except StructureError:
        # A section with a pole on the circle has no norm to be scaled by.
        return filter, build(filter, form=form, decomposition=decomposition), None


def section(rng: Random, most: int) -> tuple[list[float], list[float]]:
    """Numerator and denominator of orders of their own, with taps missing inside; some have poles on the circle."""
    b = [rng.gauss(0, 1) * rng.choice([0.05, 0.3, 1]) for _ in range(rng.randint(0, most) + 1)]
    for k in range(len(b)):
        if rng.random() < 0.25:
            b[k] = rng.choice([0.0, 0.0, 1.0, -1.0, 0.5, 2.0])
    b[-1] = b[-1] or 0.25
    a = denominator(rng, rng.randint(0, most), marginal=rng.random() < 0.2)
    if rng.random() < 0.2:
        for k in range(1, len(a) - 1):
            a[k] = rng.choice([a[k], 0.0])
    return b, a


def denominator(rng: Random, order: int, *, marginal: bool) -> list[float]:
    a = np.ones(1)
    while len(a) <= order:
        on_circle = marginal and rng.random() < 0.5
        if len(a) < order and rng.random() < 0.7:
            radius = 1.0 if on_circle else rng.choice([rng.random(), rng.uniform(0.9, 0.9999)])
            a = np.convolve(a, [1, -2 * radius * np.cos(rng.uniform(0, np.pi)), radius * radius])
        else:
            a = np.convolve(a, [1, rng.choice([1.0, -1.0]) if on_circle else rng.uniform(-0.99, 0.99)])
    return [float(value) for value in a]


# --- formats


def word(rng: Random, least: int = 4) -> str:
    bits = rng.choice([8, 12, 16, 16, 24, 32, 48, 64, rng.randint(least, 64)])
    integer = min(rng.choice([1, 1, 1, 2, 3, rng.randint(1, max(1, bits // 2))]), bits - 1)
    return f"Q{integer}.{bits - integer}"


def place(rng: Random, *, dither: bool = True) -> Any:
    stated: dict[str, Any] = {}
    if rng.random() < 0.7:
        stated["word"] = word(rng)
    if rng.random() < 0.4:
        stated["rounding"] = rng.choice(ROUNDINGS)
    if rng.random() < 0.4:
        stated["overflow"] = rng.choice(OVERFLOWS)
    if dither and rng.random() < 0.2:
        stated["dither"] = "tpdf"
    return stated["word"] if set(stated) == {"word"} else stated


def accumulator(rng: Random) -> Any:
    pick = rng.random()
    if pick < 0.4:
        return "full"
    if pick < 0.5:
        return rng.choice([32, 40, 48, 56, 64, 64])
    overflow = rng.choice(OVERFLOWS)
    if pick < 0.75:
        bits = rng.choice([24, 32, 40, 56, 64, rng.randint(8, 64)])
        return {"bits": bits, "drop": rng.choice([0, -1, 2, 8, 16, 32, 63]), "overflow": overflow}
    fraction = rng.randint(4, 62)
    return {"word": f"Q{rng.randint(1, 64 - fraction)}.{fraction}", "overflow": overflow}


def product(rng: Random) -> dict[str, Any]:
    pick = rng.random()
    if pick < 0.15:
        return {"rounding_place": "product"}
    if pick < 0.4:
        bits = rng.choice(["exact", rng.randint(2, 90), rng.randint(10, 30)])
        return {"product": {"bits": bits, "rounding": rng.choice(ROUNDINGS)}}
    return {"product": rng.randint(4, 30)} if pick < 0.5 else {}


def coefficients(rng: Random) -> Any:
    pick = rng.random()
    if pick < 0.15:
        return None
    if pick < 0.3:
        return word(rng, 8)
    stated = {"bits": rng.choice([8, 12, 16, 24, 32, 48, 64]), "rounding": rng.choice(ROUNDINGS)}
    return stated | ({"point": rng.choice(POINTS)} if rng.random() < 0.7 else {})


def fixed_keys(rng: Random) -> dict[str, Any]:
    """Keywords of `Fixed`, every one of them now and then."""
    keys: dict[str, Any] = {"signal": place(rng, dither=False) if rng.random() < 0.4 else word(rng)}
    if isinstance(keys["signal"], dict):
        keys["signal"].setdefault("word", word(rng))
    for name, choices in (("rounding", ROUNDINGS), ("overflow", OVERFLOWS)):
        if rng.random() < 0.75:
            keys[name] = rng.choice(choices)
    for name in ("input", "operand", "state", "output"):
        if rng.random() < 0.35:
            keys[name] = place(rng, dither=name != "input")
    keys |= {"accumulator": accumulator(rng), "coefficients": coefficients(rng)} | product(rng)
    keys["feedback"] = rng.choice(["subtracted", "subtracted", "negated"])
    keys["pre_sum"] = rng.choice(["exact", "exact", "signal"])
    if rng.random() < 0.35:
        keys |= {"dither": "tpdf", "dither_seed": rng.choice([0, rng.getrandbits(64)])}
    # Mostly allowed, since a format that is refused compares nothing else.
    keys |= {name: rng.random() < 0.8 for name in ("allow_vanishing", "allow_clamping")}
    return keys


# --- signals


def codes(rng: Random, keys: dict[str, Any], frames: int) -> list[int]:
    """Codes of the input's word: random, a full-scale square, an impulse, corners or a mixture; silence at the end."""
    places = Format(**keys)
    high = (1 << (places.input.bits - 1)) - 1
    corners = (high, -high - 1, 1, -1, 0, 0)
    kinds: dict[str, Callable[[int], int]] = {
        "random": lambda n: rng.randint(-high - 1, high),
        "square": lambda n: high if n // 7 % 2 == 0 else -high - 1,
        "impulse": lambda n: 0 if n else rng.choice([high, -high - 1]),
        "corners": lambda n: rng.choice(corners),
        "mixture": lambda n: rng.choice([rng.randint(-high - 1, high), rng.choice(corners)]),
    }
    kind = kinds[rng.choice(list(kinds))]
    return [kind(n) if n < 0.7 * frames else 0 for n in range(frames)]


def samples(rng: Random, type: str, frames: int) -> list[float]:
    """Noise, an impulse, a square wave, or noise about as small as the smallest normal number; silence at the end."""
    tiny = 8 * float(np.finfo(type).tiny)
    kinds: dict[str, Callable[[int], float]] = {
        "noise": lambda n: rng.gauss(0, 0.3),
        "impulse": lambda n: float(n == 0),
        "square": lambda n: 1.0 if n // 9 % 2 == 0 else -1.0,
        "tiny": lambda n: tiny * rng.gauss(0, 1),
    }
    kind = kinds[rng.choice(list(kinds))]
    return [kind(n) if n < 0.7 * frames else 0.0 for n in range(frames)]
