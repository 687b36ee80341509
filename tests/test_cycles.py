"""Limit cycles: published ones are found and proven, known ones are read back, and the certificate is checked by others."""

import copy
import json
import subprocess
import sys
from fractions import Fraction
from math import pi

import numpy as np
import pytest

from streamhost import Filter, Fixed, design, realize
from streamhost.measure.cycles import limit_cycles, recheck
from streamhost.measure.cycles.assembling import section_cycles
from streamhost.measure.cycles.boxes import Box
from streamhost.measure.cycles.certificate import certificate, script
from streamhost.measure.cycles.estimates import dead_band
from streamhost.measure.cycles.exhaustion import exhaust
from streamhost.measure.cycles.operations import Operations
from streamhost.measure.cycles.sections import Effort, examine
from streamhost.measure.cycles.seeded import anywhere
from streamhost.program.autonomous import loops_of, part_of
from streamhost.program.definition import FixedDefinition
from streamhost.program.error_bounds import bounds
from streamhost.program.native.batches import Batch


def recursion(a, fraction=14, signal="Q1.15", **keys):
    """y = x - a1 y1 - a2 y2 with coefficients as codes of so many fraction bits, in direct-1."""
    codes = [round(float(value) * 2**fraction) for value in a]
    sections = [[1 << fraction, 0, 0, 1 << fraction, *codes, *[0] * (2 - len(codes))]]
    filter = Filter.from_codes(sections, word=f"Q{32 - fraction}.{fraction}", rate=48000)
    return realize(filter, form="direct-1", format=Fixed(signal, **keys), allow_unstable=True)


def alone(realization, loop=0):
    """What is said of one section."""
    program = realization.program
    found = examine(program, loops_of(program)[loop], 0, Effort.quick(1), lambda share, doing: None)
    return section_cycles(None, program, found, 0)


def above(value, fraction=14):
    """The next code above a magnitude, so that what is a tie in the table goes up, as half-away sends it."""
    return float(np.copysign(np.ceil(abs(value) * 2**fraction) / 2**fraction, value))


def nearest(value, fraction=14):
    return round(value * 2**fraction) / 2**fraction


def step_of(program, loop=0):
    """The loop's program, and the definition of it as a function of its states."""
    part = part_of(program, loops_of(program)[loop])

    def step(states, code=0):
        definition = FixedDefinition(part.program)
        for line, state in zip(definition.lines.values(), states, strict=True):
            line[0] = int(state)
        definition.step(code)
        return tuple(line[0] for line in definition.lines.values())

    return part, step


# --- Oppenheim & Schafer, ch. 6 (from memory), recomputed with exact rationals: what stays of 7/8 in steps of 1/8


@pytest.mark.parametrize(("a", "rounding", "stays", "period"), [
    (-0.5, "half-away", 1, 1), (-0.5, "half-up", 1, 1), (-0.5, "half-even", 0, 1), (-0.5, "toward-zero", 0, 1),
    (0.5, "half-away", 1, 2), (0.5, "half-up", 0, 1), (0.5, "half-even", 0, 1), (0.5, "toward-zero", 0, 1),
])
def test_the_textbook_cycle_of_first_order_depends_on_the_tie(a, rounding, stays, period):
    realization = recursion([a], signal="Q1.3", rounding=rounding)
    result = limit_cycles(realization, [("7/8", np.array([0.875]))], quick=True)
    (ended,) = result.after_signals
    assert (0 if ended.cycle is None else ended.cycle.output_lsb) == stays
    if stays:
        assert (ended.cycle.period_frames, result.ended_lsb) == (period, stays)
        assert ended.cycle.kind == ("dc" if period == 1 else "oscillation")
    assert result.sections[0].proven
    assert result.proven_lsb >= stays


# --- Jackson 1969, second-hand; the stuck values recomputed with exact rationals


@pytest.mark.parametrize(("a", "bound"), [("19/20", 10), ("9/10", 5), ("7/8", 4), ("-9/10", 5), ("99/100", 50)])
def test_the_dead_band_formula_of_first_order(a, bound):
    assert dead_band(-Fraction(a)).lsb == bound
    assert dead_band(-Fraction(a)).period_frames == (1.0 if Fraction(a) > 0 else 2.0)


@pytest.mark.parametrize(("a", "rounding", "largest"), [
    (7 / 8, "half-away", 4), (7 / 8, "half-even", 4), (7 / 8, "toward-zero", 0), (19 / 20, "half-away", 10),
    (9 / 10, "half-away", 5), (-9 / 10, "half-away", 5), (99 / 100, "half-away", 50), (99 / 100, "toward-zero", 0),
])
def test_the_largest_stuck_value_of_first_order_is_proven(a, rounding, largest):
    section = alone(recursion([-above(a)], rounding=rounding))
    assert section.proven
    assert section.proven_lsb == largest
    if largest:
        assert section.estimated_dead_band_lsb == largest
        assert section.worst_granular.period_frames == (1 if a > 0 else 2)


# --- Jackson 1969, second-hand, and Claasen, Mecklenbräuker & Peek 1973, from memory; recomputed with exact integers


@pytest.mark.parametrize(("a1", "a2", "to_code", "k", "products", "sum_", "truncated"), [
    (0.0, 0.9, above, 5, 5, 5, 0), (-1.8, 0.9, nearest, 5, 6, 5, 0), (-1.0, 0.95, above, 10, 10, 10, 0),
])
def test_second_order_cycles_and_the_formula_that_one_of_them_exceeds(a1, a2, to_code, k, products, sum_, truncated):
    """Coefficients of 28 bits: the table's starts are -30 to 30, and so the largest of all states is at least its entry."""
    found = {}
    for name, keys in {"products": {"rounding": "half-away", "rounding_place": "product"}, "sum": {"rounding": "half-away"},
                       "truncated": {"rounding": "toward-zero"}}.items():
        section = alone(recursion([to_code(a1, 28), to_code(a2, 28)], 28, **keys))
        assert section.proven
        assert section.proven_lsb <= section.proven_bound_lsb
        found[name] = section.proven_lsb
    assert dead_band(Fraction(str(a1)), Fraction(str(a2))).lsb == k
    assert found["truncated"] == truncated
    assert found["products"] >= products
    assert found["sum"] >= sum_


def test_the_period_that_the_formula_gives():
    assert dead_band(Fraction(0), Fraction(9, 10)).period_frames == pytest.approx(4.0, abs=1e-12)
    assert dead_band(Fraction(-1), Fraction(19, 20)).period_frames == pytest.approx(2 * pi / np.arccos(0.5), abs=1e-12)


# --- Oppenheim & Schafer, ch. 6; Ebert, Mazo & Taylor 1969; second-hand and from memory, recomputed exactly


def test_the_textbook_overflow_oscillation_is_told_from_granular_ones():
    keys = {"signal": "Q1.3", "rounding": "half-away", "rounding_place": "product", "feedback": "negated"}
    wrapping = recursion([-0.75, 0.75], 2, overflow="wrap", **keys)
    _, step = step_of(wrapping.program)
    assert [step((6, -6)), step((-6, 6))] == [(-6, 6), (6, -6)]
    assert alone(wrapping).worst_overflow.section_lsb >= 6
    saturating = alone(recursion([-0.75, 0.75], 2, overflow="saturate", **keys))
    assert saturating.worst_overflow is None
    assert 0 < saturating.worst_granular.section_lsb < 6


@pytest.mark.parametrize(("a1", "a2", "oscillates"), [
    (-0.5, 0.4, False), (-0.3, -0.6, False), (0.0, 0.95, False), (-1.0, 0.5, True), (1.0, 0.5, True), (-1.6, 0.8, True),
])
def test_wrapping_oscillates_only_outside_the_condition_and_saturation_never(a1, a2, oscillates):
    for overflow, expected in (("wrap", oscillates), ("saturate", False)):
        section = alone(recursion([a1, a2], overflow=overflow))
        assert (section.worst_overflow is not None) == expected
        assert section.unresolved_states == 0


# --- the box, the walk and the batch against the definition


def test_every_cycle_of_a_small_word_is_found_as_by_following_every_state():
    """All 64 states of a word of 3 bits, in Python: what they come to is what the walk finds, overflows and all."""
    realization = recursion([-1.25, 0.75], 2, signal="Q1.2", overflow="wrap")
    part, step = step_of(realization.program)
    found = set()
    for first in range(-4, 4):
        for second in range(-4, 4):
            state = (first, second)
            for _ in range(64):
                state = step(state)
            cycle = [state]
            while (state := step(state)) != cycle[0]:
                cycle.append(state)
            found.add(frozenset(cycle))
    same = np.eye(2, dtype=np.int64)
    box = Box(same, same, (), (4, 4), ((-4, 3), (-4, 3)))
    assert box.holds_all
    walked = exhaust(part.program, box, 0, lambda share: None)
    assert walked.complete
    assert walked.states.shape[1] == len(found)
    assert all(any(tuple(map(int, state)) in cycle for cycle in found) for state in walked.states.T)


def test_a_batch_and_a_certificates_operations_are_the_definition():
    formats = [Fixed("Q1.15", coefficients={"bits": 16}),
               Fixed("Q1.15", coefficients={"bits": 18}, rounding="half-even", state="Q1.31", overflow="wrap"),
               Fixed("Q1.15", coefficients={"bits": 18}, rounding="floor",
                     accumulator={"bits": 32, "drop": 2, "overflow": "saturate"})]
    filter = design("low-pass", rate=48000, frequency=6000, q=1.2)
    for form, format in zip(("error-feedback-2", "direct-1", "transposed-2"), formats, strict=True):
        part, step = step_of(realize(filter, form=form, format=format).program)
        registers = part.program.roundings[:1]
        states = anywhere(part.program, 5, 3)
        moved = Batch(part.program, registers).run(states, np.zeros(5, np.int64), 1)
        made = Operations(part.program, 0)
        exact = recheck.function({"nodes": made.lines, "next": made.following, "codes": made.codes,
                                  "registers": [made.place[index] for index in registers]}, recheck.EXACT)
        for before, after in zip(states.T.tolist(), moved.T.tolist(), strict=True):
            assert step(before) == tuple(after) == exact(before)[0]


def test_the_bound_holds_what_a_search_finds_and_is_reached_by_a_first_order_section():
    """Of one pole the bound is half a step over 1 - |a|, which the dead band comes within one step of."""
    part, _ = step_of(recursion([-above(0.99)], rounding="half-away").program)
    _, limits = bounds(part.program)
    step = 2.0**-15
    assert limits[0] == pytest.approx(0.5 * step / (1 - above(0.99)), rel=1e-5)
    assert 50 <= limits[0] / step < 51


# --- the whole instrument


@pytest.fixture(scope="module")
def stuck():
    """A low one-pole filter: its dead band is known by hand, floor(0.5 / 0.01)."""
    return limit_cycles(recursion([-above(0.99)], rounding="half-away"),
                        [("a step", np.full(100, 0.5 * 0.01)), ("nothing", np.zeros(4))], quick=True)


def test_what_a_signal_leaves_and_where_a_constant_stalls(stuck):
    """y = x + 0.99 y: silence leaves 50, and a constant that would lead to 100 x stays 50 short of it from below."""
    assert (stuck.proven, stuck.proven_lsb, stuck.found_lsb, stuck.ended_lsb, stuck.overflow_lsb) == (True, 50, 50, 50, 0)
    assert [ended.cycle is None for ended in stuck.after_signals] == [False, True]
    assert set(np.abs(stuck.worst.wave) * 2**15) == {50.0}
    rest = [stall for stall in stuck.stalls if stall.since == "from rest" and 1 <= stall.input_lsb < 100]
    assert rest
    for stall in rest:
        assert stall.period_frames == 1
        assert 48 <= stall.off_lsb <= 51
    assert stuck.complete


def test_floats_dither_and_finite_responses_are_told_apart():
    filter = design("low-pass", rate=48000, frequency=1000, q=0.7)
    assert "floating point" in limit_cycles(realize(filter, format="float32"), []).reason
    dithered = limit_cycles(realize(filter, format=Fixed("Q1.15", coefficients={"bits": 16}, dither="tpdf")), [])
    assert dithered.reason.startswith("dithered")
    finite = limit_cycles(realize(Filter.from_coefficients([0.5, 0.5], [1.0], rate=48000), format=Fixed("Q1.15")), [])
    assert (finite.proven, finite.proven_lsb, dithered.proven_lsb) == (True, 0, None)


def test_an_interrupted_run_gives_what_is_done():
    def report(share, doing):
        raise KeyboardInterrupt

    result = limit_cycles(recursion([-above(0.99)], rounding="half-away"), [], quick=True, report=report)
    assert not result.complete
    assert not result.proven


# --- the certificate


def checked(tmp_path, document):
    """(status, what the script says), run as a user does: by another Python, without this package."""
    (tmp_path / "recheck.py").write_text(script(), encoding="utf-8")
    (tmp_path / "certificate.json").write_text(json.dumps(document), encoding="utf-8")
    command = [sys.executable, "-I", "recheck.py", "certificate.json"]
    done = subprocess.run(command, cwd=tmp_path, capture_output=True, text=True)
    return done.returncode, done.stdout


def test_the_script_ships_in_at_most_60_lines_of_the_standard_library():
    lines = script().splitlines()
    assert len(lines) <= 60
    imported = {line.split()[1] for line in lines if line.startswith(("import ", "from "))}
    assert imported <= sys.stdlib_module_names


def test_a_certificate_holds_and_a_tampered_one_does_not(stuck, tmp_path):
    document = certificate(stuck)
    assert checked(tmp_path, document) == (0, "section 1: holds; its box was walked\n")
    for tamper, said in ((_codes, "WRONG"), (_bounds, "WRONG: a bound"), (_cycles, "WRONG: other cycles"),
                         (_rounding, "WRONG"), (_transform, "WRONG: a bound")):
        forged = copy.deepcopy(document)
        tamper(forged["sections"][0])
        status, text = checked(tmp_path, forged)
        assert (status, said in text) == (1, True), tamper


def _codes(section):
    section["codes"] = [code + 1 for code in section["codes"]]


def _bounds(section):
    section["bounds"] = [bound * 0.99 for bound in section["bounds"]]


def _cycles(section):
    section["cycles"] = section["cycles"][:-1]


def _rounding(section):
    section["nodes"] = [["floor" if kind == "half-away" else kind, *rest] for kind, *rest in section["nodes"]]


def _transform(section):
    section["transform"] = [[2 * value for value in row] for row in section["transform"]]
