"""Programs against the second evaluator, which was written from the specification of the arithmetic alone."""

from collections import Counter
from random import Random
from typing import Any

import numpy as np
import oracle
import pytest
from oracle_cases import Case, codes, fixed_case, fixed_keys, float_case, samples, structure
from oracle_words import draws

import streamhost as sh
from streamhost.errors import FormatError
from streamhost.program.definition import FixedDefinition
from streamhost.program.run import run_definition

BATCH = 60
FRAMES = 40

Outcome = tuple[list[int], tuple[int, ...]]


def expected(case: Case, x: list[int], channel: int = 0) -> Outcome:
    """Codes, and how many registers saturated, registers wrapped, accumulators were lost."""
    built = case.built
    y, counts = oracle.run_fixed(case.sections, built.form, x, channel=channel, front=built.front, **case.keys)
    return y, (counts.saturations, counts.wraps, counts.accumulator_overflows)


def by_definition(case: Case, x: list[int], channel: int) -> Outcome:
    definition = FixedDefinition(case.realize(sh.Fixed).program, channel)
    y = [code for (code,) in definition.run(x)]
    kinds = definition.counters
    counts = (kinds.saturations, kinds.wraps, kinds.accumulator_overflows)
    return y, tuple(sum(kind.values()) for kind in counts)


def compare(case: Case, rng: Random) -> Counter[str]:
    """The definition and the oracle give the same codes and counts, or both refuse; what the case took."""
    channel, x = rng.randint(0, 2), codes(rng, case.keys, FRAMES)
    try:
        y, counts = expected(case, x, channel)
    except oracle.Refused:
        with pytest.raises(FormatError):
            case.realize(sh.Fixed)
        return Counter(["refused"])
    assert by_definition(case, x, channel) == (y, counts), str(case)
    taken = Counter([case.built.form, "compared"])
    taken.update(name for name, many in zip(("saturates", "wraps", "accumulator"), counts, strict=True) if many)
    taken.update({"audible": any(y), "front": case.built.front is not None, "dither": "dither" in case.keys})
    return taken


taken_in_all: Counter[str] = Counter()


@pytest.mark.parametrize("batch", range(8))
def test_the_definition_says_what_the_specification_says(batch: int) -> None:
    for seed in range(BATCH * batch, BATCH * (batch + 1)):
        rng = Random(seed)
        taken_in_all.update(compare(fixed_case(rng), rng))


def test_the_comparison_took_every_road() -> None:
    """Counted anew where the batches ran in another process; a comparison of silence or refusals would be no test."""
    taken = taken_in_all
    if taken["compared"] + taken["refused"] < 8 * BATCH:
        taken = Counter()
        for seed in range(8 * BATCH):
            rng = Random(seed)
            taken.update(compare(fixed_case(rng), rng))
    assert taken["compared"] >= 300
    assert taken["audible"] > 0.9 * taken["compared"]
    assert min(taken[form] for form in oracle.FORMS) >= 40
    for corner in ("saturates", "wraps", "dither", "refused", "front"):
        assert taken[corner] >= 20, corner
    assert taken["accumulator"] >= 10


def test_halved_pre_sums() -> None:
    """A product that no sum reads is a sum of one term: shifted back it enters its accumulator, and is rounded once."""
    for seed in range(BATCH):
        rng = Random(seed)
        compare(Case(*structure(rng, "transposed-1"), fixed_keys(rng) | {"pre_sum": "half"}), rng)


def native(case: Case, x: list[list[int]]) -> tuple[list[list[int]], tuple[int, ...]]:
    """The kernel on all channels at once, in two blocks."""
    realization = case.realize(sh.Fixed)
    block = np.array(x, np.int64).T
    y = np.concatenate([realization.process_codes(block[:11]), realization.process_codes(block[11:])])
    tally = realization.tally()
    return y.T.tolist(), (tally.saturations, tally.wraps, tally.accumulator_overflows)


@pytest.mark.parametrize("seed", range(10_000, 10_016))
def test_the_native_kernel_says_so_too(seed: int) -> None:
    """Two channels, dithered apart; the kernel's own counts are those of both."""
    rng = Random(seed)
    while True:
        case = fixed_case(rng)
        x = [codes(rng, case.keys, FRAMES) for _ in range(2)]
        try:
            runs = [expected(case, codes_of_one, channel) for channel, codes_of_one in enumerate(x)]
            break
        except oracle.Refused:
            continue
    counts = tuple(sum(pair) for pair in zip(*(run[1] for run in runs), strict=True))
    assert native(case, x) == ([run[0] for run in runs], counts), str(case)


# --- shipped arithmetics


# Source: the specification's table of shipped arithmetics; registers half-up and saturating, accumulators wrapping
# unless said, are the defaults.
SHIPPED: dict[str, dict[str, Any]] = {
    "16x16+40": {"signal": "Q1.15", "coefficients": {"bits": 16}, "accumulator": 40},
    "16x16-32": {"signal": "Q1.15", "coefficients": {"bits": 16},
                 "accumulator": {"bits": 32, "drop": -1, "overflow": "saturate"}},
    "32x16-high": {"signal": "Q1.31", "coefficients": {"bits": 16}, "accumulator": {"bits": 32, "drop": 16}},
    "32x32-high": {"signal": "Q1.31", "coefficients": {"bits": 32}, "accumulator": {"bits": 32, "drop": 32}},
    "24x24+56": {"signal": "Q1.23", "coefficients": {"bits": 24}, "accumulator": 56},
    "48x24+56": {"signal": "Q1.23", "coefficients": {"bits": 24}, "state": "Q1.47", "operand": "Q1.47",
                 "accumulator": "Q9.47"},
    "32x32+64": {"signal": "Q1.31", "coefficients": {"bits": 32}, "accumulator": 64},
}


@pytest.mark.parametrize("name", SHIPPED)
def test_shipped_arithmetics(name: str) -> None:
    def named(**_: Any) -> sh.Fixed:
        return sh.Fixed(arithmetic=name, allow_vanishing=True)

    compared = 0
    for seed in range(12):
        rng = Random(seed)
        case = Case(*structure(rng), SHIPPED[name] | {"allow_vanishing": True})
        x = codes(rng, case.keys, FRAMES)
        try:
            y, _ = expected(case, x)
        except oracle.Refused:
            with pytest.raises(FormatError):
                case.realize(named)
        else:
            assert [code for (code,) in FixedDefinition(case.realize(named).program).run(x)] == y, str(case)
            compared += 1
    assert compared >= 6


def test_the_first_dither_words() -> None:
    # Source: the specification, which states them for seed, ordinal, channel and frame 0.
    assert draws(0, 0, 0, 0) == (0x2130748AAAC80268, 0x0CC78FB979CE5090)


# --- floating point


def float_pair(seed: int) -> tuple[Case, list[float], np.ndarray]:
    rng = Random(seed)
    case = float_case(rng)
    x = samples(rng, case.keys["type"], FRAMES)
    y = oracle.run_float(case.sections, case.built.form, x, front=case.built.front, **case.keys)
    return case, x, np.array(y)


@pytest.mark.parametrize("batch", range(3))
def test_floating_point(batch: int) -> None:
    """Bit for bit, the sign of zero too."""
    for seed in range(BATCH * batch, BATCH * (batch + 1)):
        case, x, y = float_pair(seed)
        found = run_definition(case.realize(sh.Float).program, np.array(x)[:, np.newaxis])[:, 0, 0]
        np.testing.assert_array_equal(found.view(np.int64), y.view(np.int64), str(case))


def test_the_float_cases_meet_subnormals_and_flushing_and_fusing_matter() -> None:
    met = Counter()
    for seed in range(3 * BATCH):
        case, x, y = float_pair(seed)
        for key in ("fused", "flush_subnormals"):
            keys = case.keys | {key: not case.keys[key]}
            other = oracle.run_float(case.sections, case.built.form, x, front=case.built.front, **keys)
            met[key] += not np.array_equal(y, other)
        met["subnormal"] += bool(np.any((y != 0) & (np.abs(y) < float(np.finfo(case.keys["type"]).tiny))))
    assert min(met[key] for key in ("fused", "flush_subnormals", "subnormal")) >= 5


@pytest.mark.parametrize("seed", range(20_000, 20_008))
def test_native_floating_point(seed: int) -> None:
    case, x, y = float_pair(seed)
    found = case.realize(sh.Float).process(np.array(x))
    np.testing.assert_array_equal(found.view(np.int64), y.view(np.int64), str(case))
