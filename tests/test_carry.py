"""A state carried from one realization into another: the output goes on."""

from functools import cache
from itertools import permutations

import numpy as np
import pytest
from benchmarks.carrying import changes, filters, noise, run, structures
from carried_states import deviation
from form_filters import DIRECT
from form_filters import filters as small_filters
from native_runs import run_native

from streamhost import Filter, Fixed, Realization, design, forms, realize
from streamhost.diagram import Builder
from streamhost.diagram.carrying import past_input, residue_states
from streamhost.errors import RequestError, StructureError
from streamhost.program.carrying import is_run
from streamhost.program.ideal import ideal_program
from streamhost.program.native.kernel import Variant
from streamhost.program.states import read_states, write_states

RATE = 48000
HALF = 96000
"""Two seconds: long enough for the slowest of these filters to show its rounding floor."""
X = np.random.default_rng(0).uniform(-0.5, 0.5, 2 * HALF)


@cache
def low_pass(kind: str, order: int, frequency: float) -> Filter:
    more = {"ripple_db": 0.5, "stopband_db": 60} if kind == "elliptic" else {}
    return design(kind, rate=RATE, response="low-pass", order=order, frequency=frequency, **more)


def notch() -> Filter:
    return design("notch", rate=RATE, frequency=50, q=50)


@cache
def unswitched(filter: Filter, form: str) -> tuple[np.ndarray, float]:
    """The output in double-double, and how far the form in float64 is from it: its own rounding floor."""
    realization = realize(filter, form=form)
    high, low = run_native(ideal_program(realization.program), X[:, None], Variant(double=True)).y[:, :, 0].T
    return high, float(np.abs(realization.process(X) - high - low).max())


def switched(filter: Filter, before: str, after: str) -> np.ndarray:
    first, second = realize(filter, form=before), realize(filter, form=after)
    first.process(X[:HALF])
    second.carry_from(first)
    return second.process(X[HALF:])


CASES = [(low_pass, ("elliptic", 4, 200)), (notch, ())]


@pytest.mark.parametrize(("maker", "arguments"), CASES)
def test_the_output_goes_on_within_ten_times_the_rounding_floor(maker, arguments) -> None:
    """Our own bound. Not 1, since each form's floor is one run of its own errors, and the state has them too."""
    filter = maker(*arguments)
    for before, after in permutations(DIRECT, 2):
        expected, own = unswitched(filter, after)
        floor = max(own, unswitched(filter, before)[1], 2.0**-53)
        deviation = np.abs(switched(filter, before, after) - expected[HALF:]).max()
        assert deviation <= 10.0 * floor, f"{before} -> {after}"


RINGS = ("notch at 500 Hz", "butterworth 3, half-band", "moving average", "even symmetry, odd length", "taps")


@cache
def structures_of(name: str) -> tuple[Realization, ...]:
    return _all_forms(small_filters()[name])


def _all_forms(filter: Filter | list[Filter], outputs: str | None = None, every: int = 1) -> tuple[Realization, ...]:
    """Each form that carries the filter, or every so many of them, as a cascade where it can, else whole."""
    found: dict[str, Realization] = {}
    for form in tuple(forms())[::every]:
        for decomposition in ("cascade", "whole"):
            try:
                found.setdefault(form, realize(filter, form=form, decomposition=decomposition, outputs=outputs))
            except StructureError:
                continue
    return tuple(found.values())


def _in_a_ring(ring: tuple[Realization, ...]) -> list[tuple[Realization, Realization]]:
    """Each and the next one; what is run over its last inputs takes nothing from another's state, and is passed over."""
    solved = [not is_run(each.program) for each in ring]
    return [(before, next(ring[j] for j in (*range(k + 1, len(ring)), *range(k)) if solved[j]))
            for k, before in enumerate(ring)]


@pytest.mark.parametrize("name", RINGS)
def test_every_form_goes_on_where_another_ended(name) -> None:
    for before, after in _in_a_ring(structures_of(name)):
        # Ten times what one rounding of the states makes, or what that of the coefficients does.
        assert deviation(before, after).floors <= 10.0, (before, after)


def test_every_form_is_among_them() -> None:
    pairs = [pair for name in RINGS for pair in _in_a_ring(structures_of(name))]
    assert {before.form for before, _ in pairs} == set(forms())
    assert set(forms()) - {after.form for _, after in pairs} == {"running-sum"}


def test_several_outputs_and_channels_with_coefficients_of_their_own_go_on() -> None:
    crossover = _all_forms(design("linkwitz-riley", rate=RATE, order=4, frequency=2000), every=4)
    own = _all_forms([small_filters()["low-pass at 1 kHz"], small_filters()["peak at 3 kHz"]], every=3)
    assert min(len(crossover), len(own)) >= 5
    for before, after in (*_in_a_ring(crossover), *_in_a_ring(own)):
        assert deviation(before, after, channels=after.diagram.channels).floors <= 10.0, (before, after)


def test_all_outputs_of_a_form() -> None:
    half_band = _all_forms(small_filters()["butterworth 3, half-band"], outputs="all")
    assert [each.form for each in half_band] == ["all-pass-sum", "wave-digital"]
    assert all(deviation(*pair).floors <= 10.0 for pair in permutations(half_band, 2))
    # The delayed integrators make other outputs of the same names, and two states cannot continue four outputs of others.
    variable = _all_forms(small_filters()["low-pass at 1 kHz"], outputs="all")
    assert [each.form for each in variable] == ["state-variable", "state-variable-delayed"]
    assert all(deviation(*pair).missed > 1e-5 for pair in permutations(variable, 2))
    main = realize(small_filters()["low-pass at 1 kHz"], form="direct-1")
    assert all(deviation(main, each).floors <= 10.0 and deviation(each, main).floors <= 10.0 for each in variable)


def test_states_that_no_input_makes_do_not_spoil_what_all_of_them_make_together() -> None:
    """A state of transposed-1 alone is nothing that direct-1 could continue: each is missed by nearly all that it gives."""
    before, after = (realize(low_pass("elliptic", 4, 200), form=form, decomposition="whole")
                     for form in ("transposed-1", "direct-1"))
    assert deviation(before, after).floors <= 10.0


def test_a_running_sum_goes_on_to_the_bit() -> None:
    """Its state is made of its last inputs: were it solved for, the last bit of the sum would be off and stay off."""
    average = design("moving-average", rate=RATE, length=5)
    first = realize(average, form="folded", decomposition="whole")
    second, alone = (realize(average, form="running-sum", decomposition="whole", format="16x16+40") for _ in range(2))
    first.process(X[:999])
    carried = second.carry_from(first)
    assert (carried.way, carried.missed) == ("run", None)
    np.testing.assert_array_equal(second.process(X[999:2000]), alone.process(X[:2000])[999:])


@pytest.mark.slow
@pytest.mark.parametrize("name", [name for name in filters() if "high-pass" not in name])
def test_every_ordered_pair_of_forms_within_ten_floors(name) -> None:
    """The same bound, with floors as `benchmarks/carrying.py` says."""
    runs = [run(realization, noise()) for realization in structures(filters()[name])]
    worst = max(changes(runs, noise()), key=lambda change: change.floors)
    assert worst.floors <= 10.0, worst.pair


def test_an_equal_program_takes_the_state_as_it_is() -> None:
    first, second, alone = (realize(notch(), form="direct-1", format="16x16+40") for _ in range(3))
    first.process(X[:HALF])
    assert second.carry_from(first).way == "copied"
    np.testing.assert_array_equal(second.process(X[HALF:]), alone.process(X)[HALF:])


def test_past_input_is_set_and_only_the_rest_is_solved() -> None:
    filter = low_pass("butterworth", 2, 2000)
    first, second = realize(filter, form="transposed-2"), realize(filter, form="direct-1")
    first.process(X[:HALF])
    second.carry_from(first)
    states = read_states(second.program, second._memory)[:, 0]
    held = past_input(second.program.diagram)
    assert [(second.program.nodes[i].label) for i in second.program.state_offsets] == ["x1", "x2", "y1", "y2"]
    assert held == {0: (0, 1), 1: (0, 2)}
    np.testing.assert_array_equal(states[:2], [X[HALF - 1], X[HALF - 2]])


def test_past_input_survives_two_changes() -> None:
    filter = low_pass("elliptic", 4, 200)
    chain = [realize(filter, form=form) for form in ("direct-1", "transposed-2", "direct-1")]
    chain[0].process(X[: HALF - 1])
    chain[1].carry_from(chain[0])
    chain[1].process(X[HALF - 1 : HALF])
    chain[2].carry_from(chain[1])
    expected, floor = unswitched(filter, "direct-1")
    floor = max(floor, unswitched(filter, "transposed-2")[1])
    assert np.abs(chain[2].process(X[HALF:]) - expected[HALF:]).max() <= 20.0 * floor  # ten for each change


@pytest.mark.parametrize("taps", [40, 700])
def test_a_finite_response_goes_on_to_the_bit_where_it_holds_past_input(taps: int) -> None:
    filter = Filter.from_coefficients(np.random.default_rng(2).uniform(-1, 1, taps) / taps, rate=RATE)
    formats = ("float32", "float64", "float64")
    first, second, alone = (realize(filter, form="direct-1", decomposition="whole", format=format) for format in formats)
    for block in np.array_split(X[:HALF], 37):
        first.process(block)
    carried = second.carry_from(first)
    assert carried.way == ("run" if taps > 300 else "solved")
    np.testing.assert_array_equal(second.process(X[HALF:]), alone.process(X)[HALF:])


def test_other_words_take_the_state_and_what_does_not_fit_is_counted() -> None:
    filter = low_pass("butterworth", 2, 200)
    first = realize(filter, form="direct-2", format="float32")
    first.process(X[:HALF])
    second = realize(filter, form="direct-2", format=Fixed("Q1.15", coefficients="Q2.30"))
    # The state of this form is the input through 1 / A, hundreds of times larger than full scale.
    assert np.abs(read_states(first.program, first._memory)).max() > 1.0
    carried = second.carry_from(first)
    assert carried.clipped == 2
    assert set(np.abs(read_states(second.program, second._memory))[:, 0]) <= {1.0, 1.0 - 2.0**-15}


def test_fixed_point_goes_on_within_its_own_noise() -> None:
    filter, format = low_pass("butterworth", 4, 2000), Fixed("Q1.23", coefficients={"bits": 32})
    first, second, alone = realize(filter, form="direct-1", format=format), *(
        realize(filter, form="transposed-2", format=format) for _ in range(2))
    noise = np.abs(alone.process(X) - unswitched(filter, "transposed-2")[0]).max()
    first.process(X[:HALF])
    assert second.carry_from(first).clipped == 0
    deviation = np.abs(second.process(X[HALF:]) - unswitched(filter, "transposed-2")[0][HALF:]).max()
    assert deviation <= 2.0 * noise  # design review's +6 dB


def test_what_the_next_cannot_continue_is_said() -> None:
    ringing, wire = design("notch", rate=RATE, frequency=1000, q=30), Filter.from_coefficients([1.0, 0.5], rate=RATE)
    first, second = realize(ringing, form="transposed-2"), realize(wire, form="transposed-2")
    first.process(X[:HALF])
    state = read_states(first.program, first._memory)
    space = first.program.diagram.state_space()
    first_lost = abs(float((space.C @ state)[0, 0]))  # frame 0 can be taken over: one state; from frame 1 on nothing can
    assert second.carry_from(first).missed == pytest.approx(
        max(abs(float((space.C @ np.linalg.matrix_power(space.A, k) @ state)[0, 0])) for k in range(1, 500)), rel=1e-9)
    assert first_lost > 0.0


def test_channels_and_codes() -> None:
    filter = low_pass("elliptic", 4, 2000)
    two = np.stack([X, -0.3 * X[::-1]], axis=1)
    format = Fixed("Q1.15", coefficients={"bits": 32}, state="Q8.24", operand="Q8.24")
    codes = np.round(two * 2**15).astype(np.int64)
    first, second, alone = (realize(filter, form=form, format=format) for form in ("direct-1", "direct-2", "direct-2"))
    first.process_codes(codes[:HALF])
    assert second.carry_from(first).clipped == 0
    goes_on, was = second.process_codes(codes[HALF:]), alone.process_codes(codes)[HALF:]
    assert np.abs(goes_on - was).max() <= 1  # the last bit of the output's word


def test_states_are_written_and_read_back() -> None:
    realization = realize(low_pass("elliptic", 4, 2000), form="direct-2", format=Fixed("Q4.12"))
    realization.process(X[:77])
    memory = realization._memory
    states = read_states(realization.program, memory)
    before = memory.state.copy()
    memory.state[:] = 0
    assert write_states(realization.program, memory, states) == 0
    np.testing.assert_array_equal(memory.state, before)
    # Half-even: 2.5 codes and 3.5 codes.
    assert write_states(realization.program, memory, np.full_like(states, 2.5 / 4096)) == 0
    assert set(memory.state[:, 0]) == {2}
    write_states(realization.program, memory, np.full_like(states, 3.5 / 4096))
    assert set(memory.state[:, 0]) == {4}
    assert write_states(realization.program, memory, np.full_like(states, -9.0)) == len(states)
    assert set(memory.state[:, 0]) == {-(2**15)}


def test_residues_are_not_carried() -> None:
    b = Builder()
    y1, e1 = b.delay("y1"), b.delay("e1")
    y = b.sum(b.gain(b.input(), "b", 0.5), b.gain(y1, "a", 0.9), b.gain(e1, "c", 0.9), label="y")
    y1.takes(y)
    e1.takes(b.residue(y))
    b.output(y)
    diagram = b.build()
    assert residue_states(diagram) == {1}
    assert past_input(diagram) == {}


def test_what_has_not_run_gives_silence_and_rates_must_agree() -> None:
    filter = notch()
    first, second = realize(filter, form="direct-1"), realize(filter, form="direct-2")
    second.process(X[:100])
    second.carry_from(first)
    np.testing.assert_array_equal(second.process(np.zeros(10)), np.zeros(10))
    other = realize(design("notch", rate=44100, frequency=50, q=50), form="direct-1")
    with pytest.raises(RequestError, match=r"at 44100 Hz cannot be carried to 48000 Hz"):
        second.carry_from(other)
