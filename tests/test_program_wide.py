"""Two-word arithmetic at its ends: roundings and overflows of 128 bits, long dither and residues, and what is refused."""

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from native_runs import busy, codes_of, run_native
from numpy.typing import NDArray

import streamhost as sh
from streamhost.cache import load_module
from streamhost.diagram import Builder, Diagram, minus
from streamhost.errors import FilterError, FormatError, RequestError
from streamhost.formats import OVERFLOWS, ROUNDINGS, Fixed, Word
from streamhost.host.lane import Lane
from streamhost.measure.running import Run
from streamhost.program.definition import FixedDefinition
from streamhost.program.integers import overflowed, rounded
from streamhost.program.native.frame import Variant, close_text, open_text
from streamhost.program.native.kernel import SIGNATURE
from streamhost.program.native.text import Text, Value, overflowed_text, rounded_text
from streamhost.program.program import RoundArithmetic
from streamhost.program.run import lower
from streamhost.program.sources import traced_roundings

# --- the expressions of a kernel

MOST = (1 << 127) - 1
CASES = [(rounding, drop, bound) for rounding in ROUNDINGS
         for bound, drops in ((MOST, (1, 64, 127, 128)), (1 << 100, (2, 63))) for drop in drops]
WORDS = [(Word(1, bits - 1), overflow) for bits in (2, 40, 63, 64) for overflow in OVERFLOWS]


def compiled() -> Callable[[int, int, NDArray[np.int64]], None]:
    """f(low, high, out): every case of a 128-bit value given by its halves; two halves of each result."""
    text = Text()
    open_text(text, "Two-word arithmetic.")
    text("halves = carray(x_, (2,), np.int64)")
    text("out = carray(y_, (frames, 2), np.int64)")
    text("v = (wide(halves[1]) << 64) + wide(halves[0])")
    for i, (rounding, drop, bound) in enumerate(CASES):
        text(f"r{i} = wide({rounded_text(Value('v', bound), drop, rounding).text})")
        text(f"out[{i}, 0] = narrow(r{i})")
        text(f"out[{i}, 1] = narrow(r{i} >> 64)")
    for i, (word, overflow) in enumerate(WORDS, len(CASES)):
        text(f"out[{i}, 0] = {overflowed_text(Value('v', MOST), word, overflow)}")
        text(f"out[{i}, 1] = out[{i}, 0] >> 63")
    text.depth = 0
    close_text(text)
    module = load_module(str(text), "two-word arithmetic")

    def call(low: int, high: int, out: NDArray[np.int64]) -> None:
        halves = np.array([low, high])
        SIGNATURE(module.kernel.address)(halves.ctypes.data, out.ctypes.data, *[None] * 6, len(out), 1, 0)

    return call


@pytest.fixture(scope="module")
def kernel() -> Callable[[int, int, NDArray[np.int64]], None]:
    return compiled()


def signed(code: int, bits: int = 64) -> int:
    return (code + (1 << bits - 1)) % (1 << bits) - (1 << bits - 1)


def near_ties() -> st.SearchStrategy[int]:
    """Halves of a step, and one beside them either way, at every length of what is dropped."""
    return st.builds(lambda drop, k, beside: (k << drop) + (1 << drop - 1) + beside,
                     st.sampled_from(sorted({drop for _, drop, _ in CASES if drop < 128})), st.integers(-3, 2),
                     st.integers(-1, 1)).filter(lambda code: abs(code) <= MOST)


@given(st.one_of(near_ties(), st.integers(-MOST, MOST), st.integers(-5, 5), st.integers(-(2**65), 2**65),
                 st.sampled_from([MOST, -MOST, 2**126, -(2**126), 2**63, -(2**63), 2**63 - 1])))
def test_expressions_of_128_bits_are_those_of_python(kernel: Callable[[int, int, NDArray[np.int64]], None], code: int) -> None:
    out = np.zeros((len(CASES) + len(WORDS), 2), np.int64)
    low = signed(code)
    kernel(low, signed((code - low) >> 64), out)
    found = [signed((int(high) << 64) + int(low) % 2**64, 128) for low, high in out]
    for case, result in zip(CASES, found, strict=False):
        rounding, drop, bound = case
        if abs(code) <= bound:
            assert result == rounded(code, drop, rounding), case
    for (word, overflow), result in zip(WORDS, found[len(CASES):], strict=True):
        assert result == overflowed(code, word, overflow), (word, overflow)


# --- long dither, long residues


def section(*, residue: bool = False, delayed: bool = True, c: float = 0.5) -> Diagram:
    """y = 0.3 x - 0.45 y1, and with error feedback - c e1, or what is dropped, times c, as a second output."""
    b = Builder()
    x, y1 = b.input(), b.delay("y1")
    terms = [b.gain(x, "b0", 0.3, section=0), minus(b.gain(y1, "a1", 0.45, section=0))]
    e1 = b.delay("e1") if residue and delayed else None
    if e1 is not None:
        terms.append(minus(b.gain(e1, "c1", c, section=0)))
    y = b.sum(*terms, label="y")
    y1.takes(y)
    b.output(y)
    if e1 is not None:
        e1.takes(b.residue(y))
    elif residue:
        b.output(b.sum(b.gain(b.residue(y), "c0", c, section=0), label="e"), "error")
    return b.build()


def agree_in_codes(diagram: Diagram, format: Fixed) -> None:
    """Kernel and definition: outputs and what every rounding drops, its leading 62 bits where it drops more."""
    program = lower(diagram, format)
    x = codes_of(program, busy(90, 1, seed=4))
    run, definition = run_native(program, x, Variant(codes=True, traced=True)), FixedDefinition(program)
    for n, code in enumerate(x[:, 0]):
        assert definition.step(int(code)) == tuple(run.y[n, :, 0])
        for k, index in enumerate(traced_roundings(program)):
            arithmetic: Any = program.arithmetic[index]
            bits = arithmetic.drop + arithmetic.quantizer.dither
            cut = bits - 62 if bits > 63 else 0
            assert run.trace[n, 0, k] == float(definition.dropped[index] >> cut) * 2.0 ** (cut - arithmetic.drop)


# (operand, coefficient bits): what the register of y drops
LONG = {("Q1.46", 32): 62, ("Q1.46", 33): 63, ("Q1.47", 33): 64, ("Q1.47", 34): 65, ("Q1.63", 33): 80}


def long_format(operand: str, bits: int, dither: str | None) -> Fixed:
    return Fixed("Q1.15", operand=operand, coefficients={"bits": bits}, rounding="half-even", dither=dither, dither_seed=5)


@pytest.mark.parametrize(("operand", "bits", "dither"), [
    ("Q1.46", 33, None), ("Q1.47", 33, None), *((*pair, "tpdf") for pair in LONG),
])
def test_long_dither_and_long_residues(operand: str, bits: int, dither: str | None) -> None:
    diagram, format = section(residue=True, delayed=False), long_format(operand, bits, dither)
    arithmetic = lower(diagram, format).arithmetic
    assert LONG[operand, bits] == next(each.drop for each in arithmetic if isinstance(each, RoundArithmetic))
    agree_in_codes(diagram, format)


@pytest.mark.parametrize("dither", [None, "tpdf"])
def test_a_residue_that_a_delay_stores_has_at_most_64_bits(dither: str | None) -> None:
    """Its sign, the bits dropped, and one more with dither."""
    for (operand, bits), dropped in LONG.items():
        if 1 + dropped + (dither is not None) <= 64:
            agree_in_codes(section(residue=True), long_format(operand, bits, dither))
        else:
            with pytest.raises(FormatError, match=r'"residue" would stand in .* and a register has at most 64'):
                lower(section(residue=True), long_format(operand, bits, dither))


# --- what is refused


def gains(value: float = 0.999, terms: int = 1, *, mark: int | None = None, pair: bool = False, shift: int = 0) -> Diagram:
    """So many gains on the input, or on the sum of the input and a delay, each perhaps shifted, and their sum."""
    b = Builder()
    x = b.input()
    if pair:
        x = b.sum(x, b.delay("d", x), label="pair")
    products = [b.gain(x, f"b{k}", value, section=0) for k in range(terms)]
    b.output(b.sum(*(b.shift(p, shift, label="s") if shift else p for p in products), label="y", grow=mark))
    return b.build()


LONGEST: dict[str, Any] = {"signal": "Q1.63", "coefficients": {"bits": 64}}
WHOLE: dict[str, Any] = {"signal": "Q1.63", "input": "Q64.0", "operand": "Q64.0", "coefficients": "Q64.0"}
DITHERED = LONGEST | {"state": "Q2.0", "dither": "tpdf"}
REFUSED: dict[str, tuple[Diagram, dict[str, Any], str]] = {
    "sum of three": (gains(terms=3), LONGEST, 'The exact sum "y" may need 129 bits, 1 bit more than the 128 that are carr'),
    "sum of nine": (gains(terms=9), LONGEST, "may need 131 bits, 3 bits more .* coefficients by 3 bits together, or state"),
    "shift": (gains(shift=2), LONGEST, 'The value behind the shift "s" may need 129 bits'),
    "term": (gains(3.0), WHOLE | {"accumulator": "Q1.63"}, 'A term of the sum "y", at 63 fraction bits, may need 129 bits'),
    "product": (gains(-1.0, pair=True), LONGEST, 'The product "b0" may need 129 bits'),
    "code that gains bits": (gains(3.0), WHOLE, r'What "y\.q\d+" puts into Q1.63 may need 129 bits'),
    "dither": (section(), DITHERED, "with its dither, may need 129 bits.*leave the dither out"),
    "mark": (gains(mark=1), LONGEST, '"y" would stand in Q2.63, which has 65 bits, and a register has at most 64.'),
    "operand": (gains(pair=True), {"signal": "Q1.62", "input": "Q1.63", "operand": "Q2.62"},
                '"pair" would stand in Q3.62, which has 65 bits.*pre_sum = "half"'),
}


@pytest.mark.parametrize("name", REFUSED)
def test_what_no_machine_carries_is_refused_by_name(name: str) -> None:
    diagram, keys, message = REFUSED[name]
    with pytest.raises(FormatError, match=message):
        lower(diagram, Fixed(**keys))


@pytest.mark.parametrize("rounding", ["half-even", "half-away", "toward-zero"])
def test_sums_of_all_128_bits_run(rounding: str) -> None:
    """Two products of 127 bits; half a step or a mask added to their sum would not be carried."""
    agree_in_codes(gains(terms=2), Fixed(**LONGEST, rounding=rounding))
    agree_in_codes(gains(terms=2), Fixed(**LONGEST, rounding=rounding, output="Q1.7", state="Q1.7"))


def test_three_products_of_127_bits_run_in_a_stated_accumulator() -> None:
    agree_in_codes(gains(terms=3), Fixed(**LONGEST, accumulator={"bits": 64, "drop": 64}))


def test_a_coefficient_that_no_float64_holds_is_refused() -> None:
    """The largest code of 64 bits is 1 - 2^-63; the lowest is -1, and may be clamped to."""
    with pytest.raises(FormatError, match=r"would be clamped to 9223372036854775807, the largest code of Q1.63"):
        lower(gains(1.0), Fixed("Q1.63", coefficients="Q1.63", allow_clamping=True))
    program = lower(gains(-1.5), Fixed("Q1.63", coefficients="Q1.63", allow_clamping=True))
    assert program.stored is not None
    assert program.stored.codes == ((-(2**63),),)
    rows = [[2**62 + 2**10, 0, 0, 0, 0]]
    assert sh.Filter.from_codes(rows, "Q2.62", rate=48000).whole()[0] == (1 + 2.0**-52,)
    with pytest.raises(FilterError, match=r"codes\[0\]\[0\] is 4611686018427387905, which takes 63 bits"):
        sh.Filter.from_codes([[2**62 + 1, 0, 0, 0, 0]], "Q2.62", rate=48000)


# --- carrying


def test_a_state_goes_on_in_registers_of_64_bits() -> None:
    """Half a step of the output apart, and 0.12 for half a step of the two past inputs: max |b1 h[n] + b2 h[n-1]| + |b2 h[n]|
    with h that of 1/A is 0.237, from its recursion."""
    filter = sh.Filter.from_coefficients([0.02, 0.04, 0.02], [1.0, -1.8, 0.85], rate=48000)
    before = sh.realize(filter, form="direct-2", format="float64")
    after = sh.realize(filter, form="direct-1", format=Fixed("Q1.31", state="Q1.63", operand="Q1.63", coefficients="Q2.62",
                                                       accumulator={"bits": 64, "drop": 62}))
    before.process(np.random.default_rng(2).uniform(-0.5, 0.5, 500))
    assert after.carry_from(before).clipped == 0
    tail = before.process(np.zeros(100))
    assert np.abs(tail[:20]).max() > 0.01
    np.testing.assert_allclose(after.process(np.zeros(100)), tail, rtol=0, atol=0.63 * 2.0**-31)


# --- doors


def test_long_words_at_the_doors_take_codes_only() -> None:
    """A realization of 64 bits inside and 32 at its doors is the same run either way."""
    filter = sh.Filter.from_coefficients([0.4, 0.3], [1.0, -0.9], rate=48000)
    inside = sh.realize(filter, form="direct-1", format=Fixed("Q1.63", input="Q1.31", output="Q1.31", coefficients="Q2.30"))
    codes = np.random.default_rng(3).integers(-(2**31), 2**31, (300, 2))
    y = inside.process_codes(codes)
    inside.reset()
    np.testing.assert_array_equal(inside.process(codes / 2.0**31), y / 2.0**31)
    long = sh.realize(filter, form="direct-1", format=Fixed("Q1.63", input="Q1.31", coefficients="Q2.30"))
    for call in (lambda: long.process(np.zeros(3)), long.source, lambda: Lane(long, 1), lambda: Run(long, 1)):
        with pytest.raises(RequestError, match=r"output = Q1.63, 64 bits: samples are float64, which holds 53 bits"):
            call()
    assert "def kernel" in long.source(codes=True)
    extremes = [2**63 - 1, -(2**63)]
    passing = sh.realize(sh.Filter.from_coefficients([-1.0], rate=48000), form="direct-1",
                         format=Fixed("Q1.63", coefficients="Q1.31"))
    assert passing.process_codes(extremes).tolist() == [-(2**63) + 1, 2**63 - 1]
    with pytest.raises(RequestError, match=r"A code of Q1.63 runs from"):
        passing.process_codes(np.array([2**63], np.uint64))
