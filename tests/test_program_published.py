"""Programs against numbers from outside the project: textbooks, standards, closed forms."""

from collections.abc import Sequence
from typing import Any

import numpy as np
import pytest

import streamhost as sh

FORMS = ("direct-1", "direct-1-swapped", "direct-2", "transposed-1", "transposed-2")


def realized(b: Sequence[float], a: Sequence[float] = (1.0,), *, rate: float = 48000, **format: Any) -> sh.Realization:
    filter = sh.Filter.from_coefficients(b, a, rate=rate)
    return sh.realize(filter, form="direct-1", format=sh.Fixed(**format), allow_unstable=True)


def run(realization: sh.Realization, codes: Sequence[int]) -> list[int]:
    y: list[int] = realization.process_codes(np.array(codes, np.int64)).tolist()
    return y


def stored(realization: sh.Realization, fraction: int) -> dict[str, int]:
    """The codes of the coefficients by their labels."""
    diagram = realization.program.diagram
    codes = diagram.values[:, 0] * 2.0**fraction
    assert np.array_equal(codes, np.rint(codes))
    return {slot.label: int(code) for slot, code in zip(diagram.slots, codes, strict=True)}


# --- limit cycles


# Source: Oppenheim & Schafer, Discrete-Time Signal Processing, ch. 6, the example of a 4-bit register,
# x = (7/8) delta[n]; from memory, recomputed in exact rationals for every rounding. Codes are eighths.
LIMIT_CYCLES = [
    (0.5, "half-away", [7, 4, 2, 1, 1, 1, 1, 1]),
    (0.5, "half-up", [7, 4, 2, 1, 1, 1, 1, 1]),
    (0.5, "half-even", [7, 4, 2, 1, 0, 0, 0, 0]),
    (0.5, "toward-zero", [7, 3, 1, 0, 0, 0, 0, 0]),
    (-0.5, "half-away", [7, -4, 2, -1, 1, -1, 1, -1]),
    (-0.5, "half-up", [7, -3, 2, -1, 1, 0, 0, 0]),
    (-0.5, "half-even", [7, -4, 2, -1, 0, 0, 0, 0]),
    (-0.5, "toward-zero", [7, -3, 1, 0, 0, 0, 0, 0]),
]


@pytest.mark.parametrize(("a", "rounding", "expected"), LIMIT_CYCLES)
def test_first_order_limit_cycle(a: float, rounding: str, expected: list[int]) -> None:
    realization = realized([1.0], [1.0, -a], signal="Q1.3", coefficients="Q2.2", rounding=rounding)
    assert run(realization, [7] + [0] * 7) == expected


# Source: Oppenheim & Schafer, ch. 6, the example of overflow: y = Q(3/4 y1) + Q(-3/4 y2), started from y1 = 3/4 and
# y2 = -3/4; from memory, recomputed exactly. The orbits of half-up and of saturation are computed, not published.
@pytest.mark.parametrize(("rounding", "overflow", "expected"), [
    ("half-away", "wrap", [-6, 6, -6, 6, -6, 6]),
    ("half-away", "saturate", [7, 0, -5, -4, 1, 4, 2, -1, -3, -1, 1, 2]),
    ("half-up", "wrap", [-6, -8, -1, 5, 5, 0, -4, -3]),
])
def test_overflow_oscillation(rounding: str, overflow: str, expected: list[int]) -> None:
    """Each product is rounded. Two frames of a longer input word bring the outputs to -6 and 6 eighths."""
    realization = realized(
        [1.0], [1.0, -0.75, 0.75], signal="Q1.3", input="Q2.3", operand="Q2.3", coefficients="Q2.2",
        rounding=rounding, overflow=overflow, rounding_place="product", feedback="negated",
    )
    first_product = {"half-away": -5, "half-up": -4}[rounding]  # 3/4 times -6 eighths is -4.5
    y = run(realization, [-6, 6 - first_product] + [0] * len(expected))
    assert y == [-6, 6, *expected]


# --- quantizers


# Source: closed forms; the definitions of the five roundings (Lipshitz, Wannamaker & Vanderkooy, JAES 40, 1992, and
# Oppenheim & Schafer, ch. 6, for their errors).
@pytest.mark.parametrize(("rounding", "expected"), [
    ("half-away", [1, 2, 3, -1, -2, -3]),
    ("half-up", [1, 2, 3, 0, -1, -2]),
    ("half-even", [0, 2, 2, 0, -2, -2]),
    ("floor", [0, 1, 2, -1, -2, -3]),
    ("toward-zero", [0, 1, 2, 0, -1, -2]),
])
def test_ties(rounding: str, expected: list[int]) -> None:
    halves = realized([1.0], signal="Q8.0", input="Q8.1", operand="Q8.1", coefficients="Q2.1", rounding=rounding)
    assert run(halves, [1, 3, 5, -1, -3, -5]) == expected


# Source: Bennett 1948; Lipshitz, Wannamaker & Vanderkooy, JAES 40 (1992): mean, variance and mean square of the error
# in steps. 400,000 independent errors scatter by about 0.15 % in the variance and 0.001 in the mean: 1 % is seven
# times that.
@pytest.mark.parametrize(("keys", "mean", "variance", "square"), [
    ({"rounding": "half-up"}, 0, 1 / 12, 1 / 12),
    ({"rounding": "half-even"}, 0, 1 / 12, 1 / 12),
    ({"rounding": "half-away"}, 0, 1 / 12, 1 / 12),
    ({"rounding": "floor"}, -1 / 2, 1 / 12, 1 / 3),
    ({"rounding": "toward-zero"}, 0, 1 / 3, 1 / 3),
    ({"rounding": "half-even", "dither": "tpdf"}, 0, 1 / 4, 1 / 4),
], ids=str)
def test_moments_of_the_error(keys: dict[str, Any], mean: float, variance: float, square: float) -> None:
    step = 1 << 14
    # The input stays two steps inside of full scale, so that nothing saturates.
    x = np.random.default_rng(7).integers(-(2**21) + 2 * step, 2**21 - 2 * step, 400_000)
    error = errors_of(x, **keys)
    assert error.mean() == pytest.approx(mean, abs=0.01)
    assert error.var() == pytest.approx(variance, rel=0.01)
    assert np.mean(error**2) == pytest.approx(square, rel=0.01)


def errors_of(x: np.ndarray, **keys: Any) -> np.ndarray:
    """Errors in steps of Q1.7, of codes of Q1.21, through one rounding."""
    y = realized([1.0], signal="Q1.7", input="Q1.21", operand="Q1.21", output="Q1.7", coefficients="Q2.2", **keys)
    error: np.ndarray = y.process_codes(x) - x / 2**14
    return error


# Source: the same; with triangular dither of two steps neither mean nor variance depends on the input.
@pytest.mark.parametrize("offset", [0, 2**12, 2**13])
def test_dithered_errors_do_not_depend_on_the_input(offset: int) -> None:
    error = errors_of(np.full(400_000, 5 * 2**14 + offset), rounding="half-up", dither="tpdf")
    assert error.mean() == pytest.approx(0, abs=0.01)
    assert error.var() == pytest.approx(1 / 4, rel=0.01)


# --- coefficients


# Source: ITU-T G.729 (03/96), clause 3.1, eq. (1), as quoted; the integers are those of its reference code, whose
# feedback is added.
G729_B, G729_A = [0.46363718, -0.92724705, 0.46363718], [1.0, -1.9059465, 0.9114024]
G729_CODES = {"b0": 1899, "b1": -3798, "b2": 1899, "-a1": 7807, "-a2": -3733}


def test_speech_coder_high_pass_in_q12() -> None:
    format = {"signal": "Q1.15", "coefficients": "Q4.12"}
    assert stored(realized(G729_B, G729_A, rate=8000, feedback="negated", **format), 12) == G729_CODES
    subtracted = stored(realized(G729_B, G729_A, rate=8000, **format), 12)
    assert subtracted == {"b0": 1899, "b1": -3798, "b2": 1899, "a1": -7807, "a2": 3733}


# Source: computed from the decimals and from the integers of G.729 at 8 kHz, to three decimals.
def test_speech_coder_high_pass_response() -> None:
    codes = [[1899, -3798, 1899, 4096, -7807, 3733]]
    integers = sh.Filter.from_codes(codes, word="Q4.12", rate=8000)
    decimals = sh.Filter.from_coefficients(G729_B, G729_A, rate=8000)
    hertz = [20, 50, 60, 100, 140, 200, 300, 1000, 3400]
    table = {
        decimals: [-35.853, -17.718, -14.536, -7.819, -6.271, -6.021, -6.103, -6.254, -6.27],
        integers: [-33.351, -17.276, -14.218, -7.746, -6.264, -6.027, -6.108, -6.254, -6.271],
    }
    for filter, level in table.items():
        # Half of the last printed digit.
        np.testing.assert_allclose(20 * np.log10(np.abs(filter.response(hertz))), level, rtol=0, atol=0.00051)
    assert integers.response([0])[0] == 0
    assert 20 * np.log10(abs(decimals.response([0])[0])) == pytest.approx(-46.011, abs=0.00051)


def test_speech_coder_high_pass_runs_on_its_codes() -> None:
    """The difference equation of the integers, here on integers; a constant leaves nothing but rounding."""
    filter = sh.Filter.from_codes([[1899, -3798, 1899, 4096, -7807, 3733]], word="Q4.12", rate=8000)
    realization = sh.realize(filter, form="direct-1", format=sh.Fixed("Q1.15"))
    x1 = x2 = y1 = y2 = 0
    expected = []
    for x in [20000] * 500:
        y = (1899 * x - 3798 * x1 + 1899 * x2 + 7807 * y1 - 3733 * y2 + 2048) >> 12
        x1, x2, y1, y2 = x, x1, y, y1
        expected.append(y)
    assert run(realization, [20000] * 500) == expected
    # A(1) is 22 codes of 4096: a rounding of half a code holds a constant of up to 4096 / 2 / 22 codes.
    assert max(abs(y) for y in expected[-100:]) <= 4096 / 2 / 22


# Source: computed for this project on the cookbook's formulas (W3C Audio Working Group Note, 2021): a rounded to Q2.14.
@pytest.mark.parametrize(("frequency", "a1", "a2", "pole_hz", "unstable"), [
    (20, -32707, 16323, 0.0, 1),
    (50, -32616, 16233, 48.25, 0),
    (100, -32465, 16083, 46.63, 0),
    (1000, -29743, 13615, 707.29, 0),
])
def test_low_frequency_coefficients_in_q14(frequency: float, a1: int, a2: int, pole_hz: float, unstable: int) -> None:
    filter = sh.design("low-pass", rate=48000, frequency=frequency, q=2**-0.5)
    format = sh.Fixed("Q1.15", coefficients="Q2.14", allow_vanishing=True)
    realization = sh.realize(filter, form="direct-1", format=format)
    codes = stored(realization, 14)
    assert (codes["a1"], codes["a2"]) == (a1, a2)
    assert realization.unstable == unstable
    assert (16384 + a1 + a2 == 0) == (unstable == 1)
    poles = np.roots([16384, a1, a2])
    # Half of the last digit given.
    assert np.max(np.angle(poles)) * 48000 / (2 * np.pi) == pytest.approx(pole_hz, abs=0.0051)


# --- saturating operators


# Source: ITU-T G.191, basic operators, as quoted and partly from memory; evaluated by their definitions.
SATURATING = {"arithmetic": "16x16-32"}


def test_l_mult_of_both_lowest_saturates() -> None:
    whole_accumulator = realized([-1.0], signal="Q1.31", input="Q1.15", operand="Q1.15", **SATURATING)
    assert run(whole_accumulator, [-32768, 32767, -32768]) == [2147483647, -2147418112, 2147483647]
    # ... and its rounding to 16 bits saturates too.
    assert run(realized([-1.0], **SATURATING), [-32768]) == [32767]


def test_mult() -> None:
    format = {"signal": "Q1.15", "coefficients": "Q1.15", "rounding": "floor"}
    assert run(realized([-1.0], **format), [-32768]) == [32767]
    assert run(realized([0.5], **format), [16384]) == [8192]


@pytest.mark.parametrize(("b", "x", "expected"), [
    ([1.0, 1.0], [30000, 10000], 32767),  # add(30000, 10000)
    ([-1.0, 1.0], [-30000, 10000], -32768),  # sub(-30000, 10000)
])
def test_add_and_sub(b: list[float], x: list[int], expected: int) -> None:
    """In the saturating 32-bit accumulator itself, and in a register behind one that has room."""
    assert run(realized(b, signal="Q1.15", coefficients="Q2.14"), x)[-1] == expected
    # The coefficient 1 is no word of Q1.15; half of it twice is.
    halves = [value / 2 for value in b for _ in range(2)]
    assert run(realized(halves, **SATURATING), [x[0], x[0], x[1], x[1]])[-1] == expected


def test_negate_and_shift() -> None:
    assert run(realized([-1.0], signal="Q1.15", coefficients="Q1.15"), [-32768]) == [32767]
    assert run(realized([0.5], signal="Q1.15", coefficients="Q1.15", rounding="floor"), [-1]) == [-1]


def test_round() -> None:
    long_in = realized([1.0], signal="Q1.15", input="Q1.31", operand="Q1.31", coefficients="Q2.2")
    assert run(long_in, [0x00007FFF, 0x00008000]) == [0, 1]


# --- floating point


# Source: IEEE 754-2019, from memory; checked by NumPy's finfo.
@pytest.mark.parametrize(("format", "expected"), [("float32", 16777216.0), ("float64", 16777217.0)])
def test_the_largest_odd_integer(format: str, expected: float) -> None:
    filter = sh.Filter.from_coefficients([1.0, 1.0], rate=48000)
    y = sh.realize(filter, form="direct-1", format=format).process(np.array([16777216.0, 1.0]))
    assert y[-1] == expected


def test_the_unit_roundoff() -> None:
    filter = sh.Filter.from_coefficients([1.0, 1.0], rate=48000)
    y = sh.realize(filter, form="direct-1", format="float32").process(np.array([1.0, 2.0**-24, 1.0, 2.0**-23]))
    # The unit roundoff beside 1 is a tie, which goes to the even 1; eps is the step above 1.
    assert y.tolist() == [1.0, 1.0, 1.0, 1.0 + 1.1920928955078125e-07]


SMALLEST_NORMAL, SMALLEST = 1.1754943508222875e-38, 1.401298464324817e-45


@pytest.mark.parametrize("flush", [False, True])
def test_subnormals_are_kept_or_flushed(flush: bool) -> None:
    """y = y1 / 2 from the smallest normal number on: 23 halvings reach the smallest number, one more is a tie to 0."""
    filter = sh.Filter.from_coefficients([1.0], [1.0, -0.5], rate=48000)
    format = sh.Float("float32", flush_subnormals=flush)
    y = sh.realize(filter, form="direct-1", format=format).process(np.array([SMALLEST_NORMAL] + [0.0] * 25))
    if flush:
        assert y[0] == SMALLEST_NORMAL
        assert y[2:].tolist() == [0.0] * 24
    else:
        assert y[23] == SMALLEST
        assert y[24:].tolist() == [0.0, 0.0]


# --- a measurement curve in every form


# Source: Rec. ITU-R BS.1770, Annex 1, Tables 1 and 2, as quoted; responses computed, h in 40-digit arithmetic.
K_WEIGHTING = [
    [1.53512485958697, -2.69169618940638, 1.19839281085285, 1.0, -1.69065929318241, 0.73248077421585],
    [1.0, -2.0, 1.0, 1.0, -1.99004745483398, 0.99007225036621],
]
K_DB = {20: -13.2754, 31.5: -7.79, 63: -2.6639, 100: -1.1335, 200: -0.2649, 400: -0.0148, 500: 0.0425, 997: 0.691,
        1000: 0.6977, 2000: 3.0713, 4000: 3.968, 8000: 4.0394, 10000: 4.0419, 16000: 4.0431, 20000: 4.0431}
K_IMPULSE = {0: 1.53512485958697, 1: -0.11160147885084633, 2: -0.1031118890465834, 3: -0.092970011217058548,
             4: -0.082039088620428916, 5: -0.070984448825466419, 6: -0.060298624858098005, 7: -0.050326982482692273,
             100: -0.0045086461858601924, 1000: 0.00010151520483806328}


@pytest.mark.parametrize("decomposition", ["cascade", "whole"])
@pytest.mark.parametrize("form", FORMS)
def test_k_weighting_in_float64(form: str, decomposition: str) -> None:
    filter = sh.Filter.from_sections(K_WEIGHTING, rate=48000)
    realization = sh.realize(filter, form=form, decomposition=decomposition, format="float64")
    # The slowest pole, of radius 0.99502, has died to 1e-26 by then.
    n = np.arange(12_000)
    h = realization.process((n == 0).astype(float))
    # The recursion of stage 2 amplifies a rounding by 1400 (the root of its noise gain of 2e6), which leaves 1e-12
    # room; undivided, that of stage 1 comes on top with a gain of 24 at 0 Hz, 1 / A(1).
    tolerance = 1e-12 if decomposition == "cascade" else 1e-11
    np.testing.assert_allclose(h[list(K_IMPULSE)], list(K_IMPULSE.values()), rtol=0, atol=tolerance)
    hertz = np.array(list(K_DB))
    response = np.exp(-2j * np.pi * np.outer(hertz / 48000, n)) @ h
    # The table is printed to 1e-4 dB.
    np.testing.assert_allclose(20 * np.log10(np.abs(response)), list(K_DB.values()), rtol=0, atol=1e-4)
