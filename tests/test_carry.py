"""A state carried from one realization into another: the output goes on."""

from functools import cache
from itertools import permutations

import numpy as np
import pytest
from form_filters import DIRECT
from native_runs import run_native

from streamhost import Filter, Fixed, design, realize
from streamhost.diagram import Builder
from streamhost.diagram.carrying import past_input, residue_states
from streamhost.errors import RequestError
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


CASES = [
    *((low_pass, (kind, order, frequency)) for kind, order, frequency in [
        ("elliptic", 8, 20), ("elliptic", 4, 200)]),
    (notch, ()),
]  # fmt: skip


@pytest.mark.parametrize(("maker", "arguments"), CASES)
def test_the_output_goes_on_within_ten_times_the_rounding_floor(maker, arguments) -> None:
    """The figure to reach. Not 1, since each form's floor is one run of its own errors, and the state has them too."""
    filter = maker(*arguments)
    for before, after in permutations(DIRECT, 2):
        expected, own = unswitched(filter, after)
        floor = max(own, unswitched(filter, before)[1], 2.0**-53)
        deviation = np.abs(switched(filter, before, after) - expected[HALF:]).max()
        assert deviation <= 10.0 * floor, f"{before} -> {after}"


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
