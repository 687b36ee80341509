"""The agreement matrix: the native kernels against the definition, to the last bit, with the corners counted."""

from collections import Counter
from fractions import Fraction
from random import Random

import numpy as np
import pytest
from form_filters import built
from hypothesis import given, settings
from hypothesis import strategies as st
from native_runs import busy, codes_of, run_counting, run_native
from random_diagrams import random_diagram
from random_formats import random_format

import streamhost as sh
from streamhost.diagram import Diagram
from streamhost.diagram.nodes import Taps
from streamhost.errors import FormatError, StructureError
from streamhost.formats import OVERFLOWS, ROUNDINGS, Fixed, Float, Format
from streamhost.program.definition import FixedDefinition
from streamhost.program.float_definition import FloatDefinition
from streamhost.program.ideal import ideal_program
from streamhost.program.native.kernel import Variant
from streamhost.program.native.meters import meter_places
from streamhost.program.program import Program
from streamhost.program.run import input_code, lower, run_definition
from streamhost.program.sources import traced_roundings
from streamhost.structures import forms

FORMS = ("direct-1", "direct-1-swapped", "direct-2", "transposed-1", "transposed-2")

FORMATS: dict[str, Format] = {
    **{f"Q1.15 {r} {o}": Fixed("Q1.15", coefficients="Q2.14", rounding=r, overflow=o) for r in ROUNDINGS for o in OVERFLOWS},
    "every product": Fixed("Q1.15", coefficients="Q2.14", rounding_place="product", rounding="half-away", feedback="negated"),
    "short products": Fixed("Q1.23", coefficients="Q2.22", product={"bits": 26, "rounding": "half-even"}),
    "saturating accumulator": Fixed("Q1.15", coefficients="Q2.14",
                                    accumulator={"bits": 32, "drop": -1, "overflow": "saturate"}),
    "short accumulator": Fixed("Q1.15", coefficients="Q2.14", accumulator={"word": "Q2.20", "overflow": "wrap"}),
    "high words": Fixed(arithmetic="32x32-high"),
    "64-bit sums": Fixed(arithmetic="32x32+64"),
    "two-word sums": Fixed("Q1.31", coefficients="Q2.30", rounding="half-even"),
    "wide state, narrow operand": Fixed("Q1.15", coefficients="Q2.14", state="Q1.31", operand={"word": "Q1.15"}),
    "dithered": Fixed("Q1.15", coefficients="Q2.14", state="Q1.23", operand="Q1.19", dither="tpdf", dither_seed=9),
    "halved pre-sums": Fixed("Q1.15", coefficients="Q2.14", pre_sum="half", operand="Q1.14"),
    "float32": Float("float32"),
    "float64": Float("float64"),
    "float32 fused": Float("float32", fused=True),
    "float64 fused": Float("float64", fused=True),
    "float32 sums float64": Float("float32", accumulator="float64", flush_subnormals=True),
}

LONG_FORMATS: dict[str, Format] = {
    "48x24+56": Fixed(arithmetic="48x24+56"),
    "double length": Fixed("Q1.31", coefficients="Q2.30", state="Q1.63", operand="Q1.63", rounding="half-even"),
    "codes of 64 bits": Fixed("Q1.63", coefficients="Q3.61", accumulator={"bits": 64, "drop": 64, "overflow": "saturate"},
                              dither="tpdf", dither_seed=2),
}


def agree(program: Program, x: np.ndarray, *, plain: bool = True, traced: bool = False) -> Counter[str]:
    """Plain and metered kernel and definition agree, meters included; the corners that were taken.

    `traced`: the metered kernel also writes the residue of every rounding, in floating point every value, and they agree.
    """
    long = isinstance(program.format, Fixed) and max(program.format.input.word.bits, program.format.output.word.bits) > 53
    codes = None if isinstance(program.format, Float) else codes_of(program, x)
    read = codes if long else x
    metered = run_native(program, read, Variant(codes=long, metered=True, traced=traced))
    if plain:
        np.testing.assert_array_equal(run_native(program, read, Variant(codes=long)).y, metered.y)
    if codes is None:
        np.testing.assert_array_equal(metered.y, run_definition(program, x))
        if traced:
            np.testing.assert_array_equal(metered.trace, every_value(program, x))
        return Counter()
    y, corners, evaluators = run_counting(program, codes)
    np.testing.assert_array_equal(metered.y, y if long else y * 2.0**-program.format.output.word.fraction)
    if traced and evaluators[0].residues[0]:
        np.testing.assert_array_equal(metered.trace, np.stack([each.residues for each in evaluators], axis=1))
    counted: Counter[int] = Counter()
    for evaluator in evaluators:
        counters = evaluator.counters
        for kind in (counters.saturations, counters.wraps, counters.accumulator_overflows):
            counted.update(kind)
    for key, place in meter_places(program).items():
        index = key if key >= 0 else -1 - key
        if not isinstance(program.nodes[index], Taps):
            assert metered.meters[place] == counted[index], program.nodes[index].label
    assert metered.meters[0] == (0 if long else np.isnan(x).sum())
    assert metered.marks.any() == (sum(counted.values()) > 0)
    return corners


def filter_of_two_sections() -> sh.Filter:
    """Low poles and zeros: large inner values, and every term there."""
    return sh.Filter.from_sections(
        [[0.45, -0.3, 0.25, 1, -1.6, 0.75], [0.3, 0.25, -0.5, 1, 0.9, 0.5]], rate=48000)


def every_value(program: Program, x: np.ndarray) -> np.ndarray:
    """What the definition has at each node, (frames, channels, nodes)."""
    values = np.empty((*x.shape, len(program.nodes)))
    for channel in range(x.shape[1]):
        evaluator = FloatDefinition(program, channel)
        for n, value in enumerate(np.where(np.isnan(x[:, channel]), 0.0, x[:, channel])):
            evaluator.step(float(value))
            values[n, channel] = [evaluator.value[index] for index in range(len(program.nodes))]
    return values


@pytest.mark.parametrize("form", FORMS)
@pytest.mark.parametrize("name", FORMATS)
def test_kernels_agree_with_the_definition(form: str, name: str) -> None:
    realization = sh.realize(filter_of_two_sections(), form=form, format=FORMATS[name])
    agree(realization.program, busy(240, 2, seed=5), plain=form in ("direct-1", "transposed-1"))


@pytest.mark.parametrize(("form", "name"), [
    *(("direct-1", name) for name in LONG_FORMATS), ("transposed-2", "48x24+56"), ("transposed-1", "double length"),
    ("direct-2", "codes of 64 bits"),
])
def test_kernels_of_long_words_agree_with_the_definition(form: str, name: str) -> None:
    realization = sh.realize(filter_of_two_sections(), form=form, format=LONG_FORMATS[name])
    agree(realization.program, busy(240, 2, seed=7), plain=name == "48x24+56")


@pytest.mark.parametrize("form", FORMS)
def test_kernels_agree_with_the_definition_for_whole_filters(form: str) -> None:
    for format in (Fixed("Q1.23", coefficients={"bits": 24}), Float("float32")):
        agree(sh.realize(filter_of_two_sections(), form=form, decomposition="whole", format=format).program, busy(240, 1, 6))


EVERY_FORM: dict[str, Format] = {
    "wrapping, dithered": Fixed("Q1.15", coefficients={"bits": 20}, overflow="wrap", dither="tpdf", dither_seed=9,
                                allow_vanishing=True),
    "saturating accumulator, toward zero": Fixed("Q1.15", coefficients={"bits": 20}, rounding="toward-zero",
                                                 accumulator={"word": "Q1.31", "overflow": "saturate"},
                                                 allow_vanishing=True),
    "48x24+56": Fixed(arithmetic="48x24+56", allow_vanishing=True),
    "float32 fused": Float("float32", fused=True),
}
CARRIED = ("peak at 3 kHz", "notch at 500 Hz", "even symmetry, odd length", "taps", "moving average")
"""One of which every form carries whole; the first that it does is held against the definition."""


@pytest.mark.parametrize("form", forms())
def test_metered_and_traced_kernels_of_every_form_agree_with_the_definition(form: str) -> None:
    drawn = next(found for found in (built_whole(form, which) for which in CARRIED) if found is not None)
    for format in EVERY_FORM.values():
        agree(lower(drawn, format), busy(60, 1, seed=11), plain=False, traced=True)


def built_whole(form: str, which: str) -> Diagram | None:
    try:
        return built(form, "whole", which).diagram
    except StructureError as error:
        assert "cannot carry" in str(error)
        return None


@pytest.mark.parametrize("rounding", ROUNDINGS)
def test_every_corner_is_taken_many_times(rounding: str) -> None:
    """Few fraction bits make ties common; half-scale coefficients drive every register over both ends."""
    corners: Counter[str] = Counter()
    for seed, overflow in enumerate(OVERFLOWS):
        for form in FORMS:
            format = Fixed("Q1.5", coefficients="Q2.3", rounding=rounding, overflow=overflow)
            program = sh.realize(filter_of_two_sections(), form=form, format=format).program
            corners += agree(program, busy(360, 2, seed), plain=False)
    for corner in ("tie above 0, odd", "tie above 0, even", "tie below 0, odd", "tie below 0, even", "nothing dropped",
                   "overflow above", "overflow below", "operand lowest", "operand highest", "operand 0"):
        assert corners[corner] >= 50, corners


@settings(max_examples=24)
@given(st.integers(0, 2**32 - 1))
def test_kernels_of_random_diagrams_agree_with_the_definition(seed: int) -> None:
    rng = Random(seed)
    diagram = random_diagram(rng, rng.randint(3, 20), channels=rng.choice([1, 2]), step=rng.choice([None, 2.0**-6]))
    try:
        program = lower(diagram, random_format(rng))
    except FormatError:
        return
    agree(program, busy(72, 2, seed=seed))


@pytest.mark.parametrize("fold", [None, "last first", "even", "odd"])
@pytest.mark.parametrize("name", ["Q1.15 half-up saturate", "dithered", "halved pre-sums", "two-word sums", "float32",
                                  "saturating accumulator", "short accumulator", "float32 fused", "float32 sums float64",
                                  "codes of 64 bits"])
def test_kernels_of_tapped_lines_agree_with_the_definition(fold: str | None, name: str) -> None:
    rng = Random(3)
    half = [rng.randint(-8000, 8000) / 16384 for _ in range(4)]
    middle = [] if fold == "odd" else [0.25]
    mirrored = [-v for v in reversed(half)] if fold == "odd" else half[::-1]
    b = sh.Builder()
    x = b.input()
    symmetry = None if fold == "last first" else fold
    line = b.taps(x, "h", half + middle + mirrored, fold=symmetry, last_first=fold == "last first", section=0)
    b.output(b.sum(line, b.gain(b.delay("d", x, n=5), "g", 0.5, section=0), label="y"))
    b.output(b.taps(x, "one", [0.75], section=0), "single")
    program = lower(b.build(), (FORMATS | LONG_FORMATS)[name])
    agree(program, busy(120, 2, seed=1), plain=name in FORMATS or fold == "odd")


PARTS = st.lists(st.sampled_from([0, 1, 2, 3, 5, 7, 13, 31]), min_size=1, max_size=12)


@settings(max_examples=25)
@given(PARTS, st.sampled_from(["dithered", "float32", "Q1.15 half-up saturate"]), st.integers(1, 5))
def test_any_division_into_blocks_gives_the_same_bits(parts: list[int], name: str, channels: int) -> None:
    realization = sh.realize(filter_of_two_sections(), form="direct-1", format=FORMATS[name])
    x = busy(400, channels, seed=8)[: sum(parts)]
    whole = run_native(realization.program, x, Variant(metered=True))
    split = run_native(realization.program, x, Variant(metered=True), blocks=parts)
    np.testing.assert_array_equal(whole.y, split.y)
    np.testing.assert_array_equal(whole.meters, split.meters)
    np.testing.assert_array_equal(whole.memory.state, split.memory.state)


@pytest.mark.parametrize("name", ["float32", "Q1.15 half-up saturate"])
def test_a_channel_among_many_is_as_it_is_alone(name: str) -> None:
    program = sh.realize(filter_of_two_sections(), form="transposed-2", format=FORMATS[name]).program
    x = busy(200, 11, seed=2)
    together = run_native(program, x).y
    for channel in range(11):
        np.testing.assert_array_equal(together[:, :, channel], run_native(program, x[:, channel : channel + 1]).y[:, :, 0])


def test_codes_in_and_out_are_the_same_run_as_samples() -> None:
    realization = sh.realize(filter_of_two_sections(), form="direct-1", format=FORMATS["Q1.15 half-up saturate"])
    codes = np.random.default_rng(4).integers(-(2**15), 2**15, (500, 2))
    out = realization.process_codes(codes)
    realization.reset()
    np.testing.assert_array_equal(out / 2.0**15, realization.process(codes / 2.0**15))


def test_traced_residues_are_what_the_definition_dropped() -> None:
    program = sh.realize(filter_of_two_sections(), form="transposed-2", format=FORMATS["Q1.15 half-up saturate"]).program
    x = busy(100, 1, seed=3)
    run = run_native(program, x, Variant(traced=True))
    evaluator = FixedDefinition(program)
    for n, value in enumerate(x[:, 0]):
        evaluator.step(input_code(float(value), program.format.input))  # type: ignore[union-attr]
        for k, index in enumerate(traced_roundings(program)):
            drop = program.arithmetic[index].drop  # type: ignore[union-attr]
            assert run.trace[n, 0, k] == evaluator.dropped[index] / 2.0**drop


def test_the_double_double_kernel_equals_float64_to_its_rounding_and_holds_far_more() -> None:
    """An independent sum in exact fractions of the same difference equation."""
    realization = sh.realize(sh.Filter.from_sections([[0.5, 0.25, 0.125, 1, -1.5, 0.6]], rate=48000), form="direct-1")
    x = np.random.default_rng(0).uniform(-1, 1, (40, 1))
    y = run_native(ideal_program(realization.program), x, Variant(double=True)).y
    b, a = [Fraction(v) for v in (0.5, 0.25, 0.125)], [Fraction(v) for v in (-1.5, 0.6)]
    out: list[Fraction] = []
    for n in range(len(x)):
        past = sum(b[k] * Fraction(float(x[n - k, 0])) for k in range(3) if n >= k)
        out.append(past - sum(a[k - 1] * out[n - k] for k in (1, 2) if n >= k))
    worst = max(abs(out[n] - Fraction(float(y[n, 0, 0])) - Fraction(float(y[n, 1, 0]))) for n in range(len(x)))
    assert worst < Fraction(1, 2**95)  # 106 bits, less what 40 frames of a gain of about 10 take
