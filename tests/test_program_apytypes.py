"""Programs against a fixed-point library of others: apytypes, its own words, roundings and overflows."""

from collections.abc import Sequence
from random import Random

import numpy as np
import pytest
from apytypes import APyFixed, OverflowMode, QuantizationMode

import streamhost as sh
from streamhost.program.definition import FixedDefinition

FRAMES = 2000
ROUNDINGS = {
    "half-up": QuantizationMode.RND,
    "half-even": QuantizationMode.RND_CONV,
    "half-away": QuantizationMode.RND_INF,
    "floor": QuantizationMode.TRN,
    "toward-zero": QuantizationMode.TRN_ZERO,
}
OVERFLOWS = {"saturate": OverflowMode.SAT, "wrap": OverflowMode.WRAP}

# Codes of Q2.14: stable, clipping at full scale, and sixteenths, so that one sum in sixteen is a tie.
SECTIONS = {
    "second order": ([9216, -5120, 7168], [16384, -27648, 15360]),
    "first order": ([11264, 9216], [16384, -13312]),
}
COEFFICIENTS = "Q2.14"


def as_fixed(code: int, integer: int, fraction: int) -> APyFixed:
    return APyFixed(code % (1 << (integer + fraction)), int_bits=integer, frac_bits=fraction)


def as_code(value: APyFixed, bits: int) -> int:
    """The signed code of a library's value."""
    pattern = int(value.to_bits())
    return pattern - (1 << bits) if pattern >> (bits - 1) else pattern


def by_library(
    b: Sequence[int], a: Sequence[int], x: Sequence[int], fraction: int, rounding: str, overflow: str
) -> list[int]:
    """direct-1 in exact sums, one cast a frame."""
    bs, rest = [as_fixed(c, 2, 14) for c in b], [as_fixed(c, 2, 14) for c in a[1:]]
    zero = as_fixed(0, 1, fraction)
    xs, ys, found = [zero] * len(b), [zero] * (len(a) - 1), []
    for code in x:
        xs = [as_fixed(code, 1, fraction), *xs[:-1]]
        total = bs[0] * xs[0]
        for c, past in zip(bs[1:], xs[1:], strict=True):
            total = total + c * past
        for c, past in zip(rest, ys, strict=True):
            total = total - c * past
        y = total.cast(int_bits=1, frac_bits=fraction, quantization=ROUNDINGS[rounding], overflow=OVERFLOWS[overflow])
        ys = [y, *ys[:-1]]
        found.append(as_code(y, 1 + fraction))
    return found


def signal(fraction: int) -> list[int]:
    """Noise at full scale, then small noise, then silence."""
    rng, top = Random(fraction), 1 << fraction
    loud = [rng.randint(-top, top - 1) for _ in range(FRAMES // 2)]
    quiet = [rng.randint(-9, 9) for _ in range(FRAMES // 4)]
    return loud + quiet + [0] * (FRAMES - len(loud) - len(quiet))


def realization(section: str, fraction: int, rounding: str, overflow: str) -> sh.Realization:
    b, a = SECTIONS[section]
    filter = sh.Filter.from_coefficients(np.array(b) / 16384, np.array(a) / 16384, rate=48000)
    format = sh.Fixed(f"Q1.{fraction}", coefficients=COEFFICIENTS, rounding=rounding, overflow=overflow)
    return sh.realize(filter, form="direct-1", format=format)


@pytest.mark.parametrize("overflow", OVERFLOWS)
@pytest.mark.parametrize("rounding", ROUNDINGS)
@pytest.mark.parametrize("fraction", [15, 23])
@pytest.mark.parametrize("section", SECTIONS)
def test_the_definition_equals_the_library(section: str, fraction: int, rounding: str, overflow: str) -> None:
    x = signal(fraction)
    expected = by_library(*SECTIONS[section], x, fraction, rounding, overflow)
    definition = FixedDefinition(realization(section, fraction, rounding, overflow).program)
    assert [code for (code,) in definition.run(x)] == expected
    counters = definition.counters
    overflowed = counters.saturations if overflow == "saturate" else counters.wraps
    assert sum(overflowed.values()) > 20


@pytest.mark.parametrize("overflow", OVERFLOWS)
@pytest.mark.parametrize("rounding", ROUNDINGS)
def test_the_kernel_equals_the_library(rounding: str, overflow: str) -> None:
    x = signal(15)
    expected = by_library(*SECTIONS["second order"], x, 15, rounding, overflow)
    assert realization("second order", 15, rounding, overflow).process_codes(np.array(x)).tolist() == expected


def test_the_roundings_are_told_apart_by_the_signal() -> None:
    for b, a in SECTIONS.values():
        outputs = {tuple(by_library(b, a, signal(15), 15, rounding, "saturate")) for rounding in ROUNDINGS}
        assert len(outputs) == len(ROUNDINGS)
