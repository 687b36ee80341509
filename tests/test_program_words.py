"""Shipped arithmetics and double-length direct forms against integer loops written here, one second-order section."""

from collections.abc import Sequence
from dataclasses import dataclass
from random import Random
from typing import Any

import pytest

import streamhost as sh
from streamhost.program.definition import FixedDefinition


@dataclass(frozen=True)
class Core:
    """One arithmetic in numbers: (bits, fraction) of what comes in and out, of state, of coefficients, of the accumulator.

    `lost`: whether the filter below makes sums that leave the accumulator.
    """

    format: dict[str, Any]
    signal: tuple[int, int]
    state: tuple[int, int]
    coefficient: tuple[int, int]
    accumulator: tuple[int, int]
    saturating: bool = False
    lost: bool = False


# Source: the table of shipped arithmetics; of N bits the accumulator has product fraction - drop fraction bits. The
# coefficients below lie between 1 and 2, so that their common point leaves two integer bits.
CORES = {
    "16x16+40": Core({"arithmetic": "16x16+40"}, (16, 15), (16, 15), (16, 14), (40, 29)),
    "16x16-32": Core({"arithmetic": "16x16-32"}, (16, 15), (16, 15), (16, 14), (32, 30), saturating=True, lost=True),
    "32x16-high": Core({"arithmetic": "32x16-high"}, (32, 31), (32, 31), (16, 14), (32, 29), lost=True),
    "32x32-high": Core({"arithmetic": "32x32-high"}, (32, 31), (32, 31), (32, 30), (32, 29), lost=True),
    "24x24+56": Core({"arithmetic": "24x24+56"}, (24, 23), (24, 23), (24, 22), (56, 45)),
    "48x24+56": Core({"arithmetic": "48x24+56"}, (24, 23), (48, 47), (24, 22), (56, 47)),
    "48x24+56 in 50 bits": Core({"arithmetic": "48x24+56", "accumulator": "Q3.47"}, (24, 23), (48, 47), (24, 22), (50, 47),
                                lost=True),
    "32x32+64": Core({"arithmetic": "32x32+64"}, (32, 31), (32, 31), (32, 30), (64, 61), lost=True),
    "double length, 32 bits": Core({"signal": "Q1.31", "state": "Q1.63", "operand": "Q1.63", "coefficients": "Q2.30"},
                                   (32, 31), (64, 63), (32, 30), (128, 93)),
    "double length, 16 bits": Core({"signal": "Q1.15", "state": "Q1.47", "operand": "Q1.47", "coefficients": "Q2.30"},
                                   (16, 15), (48, 47), (32, 30), (128, 77)),
    "64x64, high": Core({"signal": "Q1.31", "state": "Q1.63", "operand": "Q1.63", "coefficients": "Q2.62",
                         "accumulator": {"bits": 64, "drop": 64}}, (32, 31), (64, 63), (64, 62), (64, 61), lost=True),
}
B, A = [1.9, 1.8, 1.7], [1.0, -1.61, 0.72]


def wrapped(code: int, bits: int) -> int:
    return (code + (1 << bits - 1)) % (1 << bits) - (1 << bits - 1)


def clipped(code: int, bits: int) -> int:
    return max(-(1 << bits - 1), min(code, (1 << bits - 1) - 1))


def half_up(code: int, drop: int) -> int:
    """Without its last bits, or with more zeros."""
    return code << -drop if drop <= 0 else (code + (1 << drop - 1)) >> drop


class Section:
    """The codes of one section, its accumulator and its registers, on plain integers."""

    def __init__(self, core: Core) -> None:
        self.core = core
        self.b = [round(value * 2 ** core.coefficient[1]) for value in B]
        self.a = [round(value * 2 ** core.coefficient[1]) for value in A]
        self.saturations = self.lost = 0

    def total(self, terms: Sequence[tuple[int, int, int]]) -> int:
        """Codes at so many fraction bits with a sign, added one after the other."""
        bits, fraction = self.core.accumulator
        total = exact = 0
        for sign, code, at in terms:
            term = code << fraction - at if at <= fraction else code >> at - fraction
            exact += sign * term
            if self.core.saturating:
                total = clipped(total + sign * clipped(term, bits), bits)
            else:
                total = wrapped(total + sign * term, bits)
        self.lost += total != exact
        return total

    def register(self, code: int, at: int, word: tuple[int, int]) -> int:
        code = half_up(code, at - word[1])
        self.saturations += clipped(code, word[0]) != code
        return clipped(code, word[0])

    def direct_1(self, x: Sequence[int]) -> list[int]:
        """y = b2 x2 - a2 y2 + b1 x1 - a1 y1 + b0 x, kept as `state` says and put out as `signal` does."""
        core = self.core
        in_x, in_y = core.signal[1] + core.coefficient[1], core.state[1] + core.coefficient[1]
        x1 = x2 = y1 = y2 = 0
        out = []
        for x0 in x:
            b, a = self.b, self.a
            y = self.total([(1, b[2] * x2, in_x), (-1, a[2] * y2, in_y), (1, b[1] * x1, in_x), (-1, a[1] * y1, in_y),
                            (1, b[0] * x0, in_x)])
            y = self.register(y, core.accumulator[1], core.state)
            x1, x2, y1, y2 = x0, x1, y, y1
            out.append(y if core.state == core.signal else self.register(y, core.state[1], core.signal))
        return out

    def transposed_2(self, x: Sequence[int]) -> list[int]:
        """y = b0 x + s1; s1 = b1 x - a1 y + s2; s2 = b2 x - a2 y: y as `signal` says, s1 and s2 as `state` does."""
        core, at = self.core, self.core.signal[1] + self.core.coefficient[1]
        s1 = s2 = 0
        out = []
        for x0 in x:
            b, a = self.b, self.a
            y = self.register(self.total([(1, b[0] * x0, at), (1, s1, core.state[1])]), core.accumulator[1], core.signal)
            t1 = self.total([(1, b[1] * x0, at), (-1, a[1] * y, at), (1, s2, core.state[1])])
            t2 = self.total([(1, b[2] * x0, at), (-1, a[2] * y, at)])
            s1, s2 = (self.register(t, core.accumulator[1], core.state) for t in (t1, t2))
            out.append(y)
        return out


def signal(bits: int) -> list[int]:
    """Noise at full scale and 60 dB below, then full-scale squares, which leave registers at either end, then silence."""
    rng, top = Random(bits), 1 << bits - 1
    noise = [rng.randint(-top, top - 1) for _ in range(300)] + [rng.randint(-top >> 10, top >> 10) for _ in range(200)]
    return noise + [top - 1 if n // 11 % 2 else -top for n in range(200)] + [top - 1] * 20 + [-top] * 20 + [0] * 60


@pytest.mark.parametrize(("form", "name"), [
    *(("direct-1", name) for name in CORES),
    *(("transposed-2", name) for name in ("48x24+56", "48x24+56 in 50 bits")),
])
def test_one_section_is_the_loop_of_integers(form: str, name: str) -> None:
    core = CORES[name]
    realization = sh.realize(sh.Filter.from_coefficients(B, A, rate=48000), form=form, format=sh.Fixed(**core.format))
    section, x = Section(core), signal(core.signal[0])
    expected = section.direct_1(x) if form == "direct-1" else section.transposed_2(x)
    definition = FixedDefinition(realization.program)
    assert [code for (code,) in definition.run(x)] == expected
    assert realization.process_codes(x).tolist() == expected
    tally = realization.tally()
    assert (tally.saturations, tally.accumulator_overflows) == (section.saturations, section.lost)
    assert section.saturations > 20
    assert section.lost > 20 if core.lost else section.lost == 0


def test_longer_registers_drop_less() -> None:
    """A state of double length is heard in the output, or the tests above would not tell the two apart."""
    x = signal(24)
    single, double = (Section(CORES[name]).direct_1(x) for name in ("24x24+56", "48x24+56"))
    assert sum(a != b for a, b in zip(single, double, strict=True)) > 100
