"""Laws that every program keeps, whatever the diagram and the format."""

from dataclasses import replace
from random import Random

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from native_runs import Run, run_native
from random_diagrams import random_diagram
from random_formats import random_format

from streamhost.diagram import Builder, Diagram, Round, minus
from streamhost.errors import DiagramError, FormatError
from streamhost.formats import Fixed, Float, Format
from streamhost.program.definition import FixedDefinition
from streamhost.program.dither import dither_key, dither_value, dither_word, mix
from streamhost.program.native.kernel import Variant
from streamhost.program.run import lower, run_definition

SEEDS = st.integers(0, 2**32 - 1)


def drawn(seed: int, **options: object) -> tuple[Diagram, Format]:
    """A diagram and a format that go together."""
    rng = Random(seed)
    while True:
        diagram = random_diagram(rng, rng.randint(3, 24), step=rng.choice([None, 2.0**-6]), **options)  # type: ignore[arg-type]
        format = random_format(rng)
        try:
            lower(diagram, format)
        except FormatError:
            continue
        return diagram, format


def signal(seed: int, frames: int = 48, channels: int = 1) -> np.ndarray:
    return np.random.default_rng(seed).uniform(-1.2, 1.2, (frames, channels))


@given(SEEDS)
def test_a_second_pass_changes_no_bit(seed: int) -> None:
    diagram, format = drawn(seed)
    once = lower(diagram, format)
    twice = lower(once.diagram, format)
    x = signal(seed)
    np.testing.assert_array_equal(run_definition(once, x), run_definition(twice, x))
    assert len(twice.roundings) == len(once.roundings)
    assert twice.ordinals == once.ordinals


@given(SEEDS)
def test_every_register_and_output_of_a_fixed_program_stands_in_its_word(seed: int) -> None:
    diagram, format = drawn(seed)
    program = lower(diagram, format)
    if isinstance(format, Float):
        return
    definition = FixedDefinition(program)
    rng = Random(seed)
    for _ in range(32):
        definition.step(rng.randint(format.input.word.low, format.input.word.high))
        for index in program.roundings:
            node = program.nodes[index]
            assert isinstance(node, Round) and node.quantizer is not None
            assert node.quantizer.word.low <= definition.value[index] <= node.quantizer.word.high
        for index, number in enumerate(program.numbers):
            assert abs(definition.value[index]) <= number.bound, program.nodes[index].label


@given(SEEDS)
def test_new_values_of_an_equal_graph_make_the_same_program_where_points_and_lengths_stay(seed: int) -> None:
    diagram, format = drawn(seed)
    first = lower(diagram, format)
    again = lower(diagram.with_values(diagram.values.copy()), format)
    assert first.key == again.key


def tapped(length: int, fold: str | None, values: list[float]) -> Diagram:
    """The same line as one node."""
    b = Builder()
    symmetry = None if fold == "last first" else fold
    b.output(b.taps(b.input(), "h", values, fold=symmetry, last_first=fold == "last first", section=0))
    assert len(values) == length
    return b.build()


def explicit(length: int, fold: str | None, values: list[float]) -> Diagram:
    """The same line as delays, gains and one sum, taps from tap 0, pairs from both ends inwards."""
    b = Builder()
    x = b.input()
    line = [x]
    for k in range(1, length):
        line.append(b.delay(f"x{k}", line[-1]))
    terms = []
    if fold == "last first":
        terms = [b.gain(line[k], f"h{k}", values[k], section=0, part="b") for k in reversed(range(length))]
    for k in range({None: length, "last first": 0}.get(fold, (length + 1) // 2)):
        last = length - 1 - k
        if fold is None or last == k:
            if fold != "odd":
                terms.append(b.gain(line[k], f"h{k}", values[k], section=0, part="b"))
            continue
        pair = b.sum(line[k], line[last] if fold == "even" else minus(line[last]), label=f"p{k}")
        terms.append(b.gain(pair, f"h{k}", values[k], section=0, part="b"))
    b.output(b.sum(*terms, label="y"))
    return b.build()


@settings(max_examples=60)
@given(SEEDS, st.integers(2, 9), st.sampled_from([None, "last first", "even", "odd"]))
def test_a_tapped_line_equals_its_delays_gains_and_sum(seed: int, length: int, fold: str | None) -> None:
    rng = Random(seed)
    half = [rng.randint(-127, 127) / 128 for _ in range((length + 1) // 2)]
    if fold == "odd" and length % 2:
        half[-1] = 0.0
    other = half[: length // 2][::-1]
    values = half + (other if fold == "even" else [-v for v in other])
    if fold in (None, "last first"):
        values = [rng.randint(-127, 127) / 128 for _ in range(length)]
    format = random_format(rng)
    x = signal(seed)
    try:
        one = lower(tapped(length, fold, values), format)
    except FormatError:
        with pytest.raises(FormatError):
            lower(explicit(length, fold, values), format)
        return
    np.testing.assert_array_equal(run_definition(one, x), run_definition(lower(explicit(length, fold, values), format), x))


def biquad(b: list[float], a: list[float], c: list[float] | None = None) -> Diagram:
    """direct-1, row by row from the last delay, with error feedback where c is given."""
    d = Builder()
    x = d.input()
    x1 = d.delay("x1", x)
    x2 = d.delay("x2", x1)
    y1 = d.delay("y1")
    y2 = d.delay("y2", y1)
    e1, e2 = (d.delay("e1"), d.delay("e2")) if c else (None, None)

    def row(k: int, xk: object, yk: object, ek: object) -> list[object]:
        terms: list[object] = [d.gain(xk, f"b{k}", b[k], section=0, part="b")]  # type: ignore[arg-type]
        if yk is not None:
            terms.append(minus(d.gain(yk, f"a{k}", a[k], section=0, part="a", feedback=True)))  # type: ignore[arg-type]
        if ek is not None and c:
            terms.append(minus(d.gain(ek, f"c{k}", c[k], section=0, part="c")))  # type: ignore[arg-type]
        return terms

    y = d.sum(*row(2, x2, y2, e2), *row(1, x1, y1, e1), *row(0, x, None, None), label="y")  # type: ignore[arg-type]
    y1.takes(y)
    if e1 is not None and e2 is not None:
        e1.takes(d.residue(y))
        e2.takes(e1)
    d.output(y)
    return d.build()


@settings(max_examples=40)
@given(SEEDS, st.sampled_from(["half-up", "half-even", "half-away", "floor", "toward-zero"]))
def test_error_feedback_with_the_whole_denominator_equals_state_and_operand_at_the_accumulators_word(
    seed: int, rounding: str
) -> None:
    rng = np.random.default_rng(seed)
    radius, angle = rng.uniform(0.3, 0.97), rng.uniform(0.05, 3.0)
    a = [1.0, float(np.round(-2 * radius * np.cos(angle) * 2**14) / 2**14), float(np.round(radius**2 * 2**14) / 2**14)]
    b = [0.06, -0.03, 0.05]
    same_sums: dict[str, object] = {"coefficients": "Q2.14", "rounding": rounding, "accumulator": "Q8.27"}
    shaped = lower(biquad(b, a, a), Fixed("Q2.13", **same_sums))  # type: ignore[arg-type]
    wide = lower(biquad(b, a), Fixed("Q2.13", state="Q2.27", operand="Q2.27", **same_sums))  # type: ignore[arg-type]
    x = rng.uniform(-0.4, 0.4, (300, 1))
    y = run_definition(shaped, x)
    assert np.abs(y).max() < 2.0, "nothing overflows"
    np.testing.assert_array_equal(y, run_definition(wide, x))


def test_the_dither_of_seed_ordinal_channel_and_frame_0() -> None:
    """The two words that the specification of the arithmetic states."""
    key = dither_key(0, 0, 0)
    assert [dither_word(key, 0, j) for j in (0, 1)] == [0x2130748AAAC80268, 0x0CC78FB979CE5090]
    assert mix(0) == 0


def test_dither_is_triangular_within_one_step_either_way_and_none_where_nothing_is_dropped() -> None:
    key = dither_key(7, 3, 1)
    values = np.array([dither_value(key, n, 8) for n in range(20000)])
    assert values.min() >= -255 and values.max() <= 255
    # variance of the difference of two uniform values of 8 bits is (256^2 - 1) / 6; 20,000 draws: 3 % is 4 sigma
    assert values.var() == pytest.approx((256**2 - 1) / 6, rel=0.03)
    assert dither_value(key, 5, 0) == dither_value(key, 5, -3) == 0
    assert abs(dither_value(key, 5, 70)) < 1 << 70


def test_a_loop_of_delays_that_nothing_drives_has_no_word() -> None:
    b = Builder()
    x = b.input()
    first = b.delay("d1")
    second = b.delay("d2", first)
    first.takes(second)
    b.output(b.sum(x, second, label="y"))
    with pytest.raises(DiagramError, match="drive each other and nothing drives them"):
        lower(b.build(), Fixed("Q1.15"))


@pytest.mark.parametrize("seed", range(10))
def test_channels_that_run_at_once_have_the_bits_that_each_has_alone(seed: int) -> None:
    """Kernels of every kind, in groups of 2, 4 or 8 of eleven channels, which leave a rest."""
    diagram, format = drawn(seed)
    program, fixed = lower(diagram, format), isinstance(format, Fixed)
    x: np.ndarray = signal(seed, 40, 11)
    x[::7] = np.nan
    if isinstance(format, Fixed):
        word = format.input.word
        x = np.random.default_rng(seed).integers(word.low, word.high, x.shape)
    kinds = [Variant(codes=fixed), Variant(codes=fixed, metered=True, traced=True)]
    for variant in kinds if fixed else [*kinds, Variant(double=True)]:
        alone = run_native(program, x, variant, blocks=[13, 27])
        at_once = run_native(program, x, replace(variant, width=(2, 4, 8)[seed % 3]), blocks=[13, 27])
        for first, second in zip(_everything(at_once), _everything(alone), strict=True):
            np.testing.assert_array_equal(first, second)


def _everything(run: Run) -> tuple[np.ndarray, ...]:
    return run.y, run.meters, run.marks, run.trace, run.memory.state
