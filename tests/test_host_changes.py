"""Changes at frames: what each changeover makes of the next lane's state, for any division into blocks."""

import weakref
from functools import cache

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from switched_runs import switched
from test_host_step import divided

import streamhost as sh
from streamhost.errors import RequestError
from streamhost.host import Change, Changed, Device, Guard, Host, Lane
from streamhost.host.banks import ramp
from streamhost.host.clock import run_on_clock
from streamhost.host.plan import parse_change
from streamhost.host.shared import Shared, layout
from streamhost.host.sources import generated
from streamhost.host.step import SIGNATURE
from streamhost.program.carrying import is_run
from streamhost.realization import Realization

RATE = 48000
X = np.random.default_rng(0).uniform(-0.5, 0.5, (6000, 2))
AT = 2345
Q23 = sh.Fixed("Q1.23", coefficients={"bits": 32})


@cache
def low_pass(order: int = 4, frequency: float = 2000.0) -> sh.Filter:
    return sh.design("butterworth", rate=RATE, response="low-pass", order=order, frequency=frequency)


@cache
def realized(form: str, format: str = "float64", frequency: float = 2000.0) -> Realization:
    return sh.realize(low_pass(frequency=frequency), form=form, format=Q23 if format == "Q1.23" else format)


def fresh(realization: Realization, x: np.ndarray = X) -> np.ndarray:
    """Its output from zero state."""
    realization.reset()
    return realization.process(x)


# What each changeover gives, told by the realizations themselves


@pytest.mark.parametrize("format", ["float64", "float32", "Q1.23"])
@pytest.mark.parametrize(("before", "after"), [("direct-1", "transposed-2"), ("transposed-2", "direct-1")])
def test_carry_gives_what_carry_from_gives_at_that_frame_to_the_bit(before: str, after: str, format: str) -> None:
    first, second = realized(before, format), realized(after, format)
    found = switched(first, second, X, AT, "carry", block=700)
    first.reset()
    first.process(X[:AT])
    carried = second.carry_from(first)
    assert found.output[AT:].tobytes() == second.process(X[AT:]).tobytes()
    assert found.output[:AT].tobytes() == fresh(first)[:AT].tobytes()
    assert found.clipped == carried.clipped


def test_a_carried_state_that_does_not_fit_is_counted() -> None:
    # The state of this form is the input through 1 / A, hundreds of times larger than full scale at 200 Hz.
    narrow = sh.realize(low_pass(2, 200.0), form="direct-2", format=sh.Fixed("Q1.15", coefficients="Q2.30"))
    wide = sh.realize(low_pass(2, 200.0), form="direct-2", format="float32")
    found = switched(wide, narrow, X, AT, "carry")
    wide.reset()
    wide.process(X[:AT])
    assert found.clipped == narrow.carry_from(wide).clipped > 0
    assert found.output[AT:].tobytes() == narrow.process(X[AT:]).tobytes()


def test_a_long_response_that_ends_is_carried_as_it_has_run() -> None:
    taps = np.random.default_rng(2).uniform(-1, 1, 700) / 700
    fir = sh.realize(sh.Filter.from_coefficients(taps, rate=RATE), form="direct-1", decomposition="whole")
    assert is_run(fir.program)
    other = realized("direct-1")
    found = switched(other, fir, X, AT, "carry")
    other.reset()
    other.process(X[:AT])
    fir.carry_from(other)
    assert found.output[AT:].tobytes() == fir.process(X[AT:]).tobytes()
    host = Host([Lane(other, 2), Lane(fir, 2)])
    host.plan.change(Change(100, 1, "cold"))
    host.plan.change(Change(500, 0, "warm"))
    with pytest.raises(RequestError, match="last 699 inputs, which it has at frame 799"):
        host.plan.change(Change(798, 1, "carry"))
    host.plan.change(Change(799, 1, "carry"))


def test_cold_begins_from_zero_and_warm_has_run_all_along() -> None:
    first, second = realized("direct-1"), realized("transposed-2")
    cold, warm = (switched(first, second, X, AT, how).output for how in ("cold", "warm"))
    assert cold[AT:].tobytes() == fresh(second, X[AT:]).tobytes()
    assert warm[AT:].tobytes() == fresh(second)[AT:].tobytes()
    assert cold[:AT].tobytes() == warm[:AT].tobytes() == fresh(first)[:AT].tobytes()


def test_fade_crosses_over_in_a_straight_line() -> None:
    first, second = realized("direct-1"), realized("direct-1", frequency=4000.0)
    found = switched(first, second, X, AT, "fade", fade_frames=99)
    share = np.clip((np.arange(len(X)) + 1 - AT) / 100, 0.0, 1.0)[:, np.newaxis]
    np.testing.assert_allclose(found.output, fresh(first) * (1 - share) + fresh(second) * share, atol=2**-52)
    assert found.output[AT + 99 :].tobytes() == fresh(second)[AT + 99 :].tobytes()


@pytest.mark.parametrize(("form", "first", "largest"), [("direct-1", 1.0, 1.0), ("direct-2", 0.010880, 1.0427)])
def test_keep_on_a_constant_shows_how_the_forms_differ(form: str, first: float, largest: float) -> None:
    """Low-pass 1 kHz -> 100 Hz (Q = 1/sqrt 2, 48 kHz) on 1.0 in steady state, simulated directly for this project:
    direct-1 has no transient, direct-2 begins with 0.010880 and rises to 1.0427."""
    filters = [sh.design("low-pass", rate=RATE, frequency=frequency, q=2**-0.5) for frequency in (1000.0, 100.0)]
    pair = [sh.realize(filter, form=form) for filter in filters]
    heard = switched(pair[0], pair[1], np.ones((96000, 1)), 48000, "keep").output[48000:]
    assert heard[0, 0] == pytest.approx(first, abs=5e-7)
    assert heard.max() == pytest.approx(largest, abs=5e-5)
    if form == "direct-1":
        assert np.abs(heard - 1.0).max() < 1e-11  # the rounding of float64, gained up by poles at 100 Hz


def test_carry_and_warm_go_on_as_the_target_within_its_own_noise() -> None:
    """Our own bounds: float64 within ten times the rounding floor, Q1.23 within the realization's own noise + 6 dB."""
    quiet = X / 8  # a state that is solved for may be larger than the one that would have come, and has to fit its word
    exact = fresh(realized("direct-1"), quiet)
    for format in ("float64", "Q1.23"):
        first, second = realized("transposed-2", format), realized("direct-1", format)
        own = max(np.abs(fresh(each, quiet)[AT:] - exact[AT:]).max() for each in (first, second))
        floor = 10 * max(own, 2.0**-53) if format == "float64" else 2 * own
        for how in ("carry", "warm"):
            assert np.abs(switched(first, second, quiet, AT, how).output[AT:] - exact[AT:]).max() <= floor


# Any division into blocks


WAYS = (("warm", 0), ("keep", 1), ("cold", 2), ("carry", 1), ("fade", 0), ("carry", 2))


def everything(lengths: list[int], begins: int = 0) -> tuple[bytes, ...]:
    """All that a run leaves behind, with every kind of change in it, in blocks of these lengths."""
    lanes = [Lane(realized("direct-1", frequency=frequency), 2, metered=True, ideal=True) for frequency in (1000.0, 2000.0)]
    lanes.append(Lane(realized("transposed-2", "Q1.23"), 2, match=0.7))
    host = Host(lanes, 6000, device=Device(2, 3), recent=1 << 13, begins=begins)
    for k, (how, lane) in enumerate(WAYS):
        host.plan.change(Change(500 * k + 77, lane, how), fade_frames=301)
    host.plan.move(0, [realized("direct-1", frequency=1000.0 + 50 * k) for k in range(8)], 900)
    host.plan.take(generated("pink", RATE, 2), 3000)
    host.plan.subtract("ideal", 40.0, 3600)
    host.plan.subtract(1, 0.0, 4100)
    host.come_up()
    heard, out = [], []
    for block in divided(X, lengths):
        sent = np.zeros((len(block), 3))
        host.step(block, sent)
        heard.append(host.heard_block.copy())
        out.append(sent)
    assert len(host.plan.changed) == len(WAYS)
    rings = [np.roll(ring, -begins, axis=0) for ring in (host.shared.heard, host.shared.sent, *host.shared.outputs[:3])]
    return (np.concatenate(heard).tobytes(), np.concatenate(out).tobytes(), *(ring.tobytes() for ring in rings),
            *(lane.state_hash().encode() for lane in lanes), repr(host.plan.changed).encode())


@cache
def whole() -> tuple[bytes, ...]:
    return everything([len(X)])


@given(lengths=st.lists(st.sampled_from([0, 1, 3, 31, 32, 64, 101, 1000]), min_size=1, max_size=8))
@settings(max_examples=6)
def test_any_division_into_blocks_gives_the_same_bits_changes_and_all(lengths: list[int]) -> None:
    assert everything([*lengths, 257]) == whole()


def test_a_run_that_begins_late_is_the_same_run() -> None:
    """Where counters pass 2^32."""
    assert everything([128], begins=2**32 - 1000) == whole()


@pytest.mark.slow
def test_an_hour_that_begins_just_before_frame_2_to_32() -> None:
    """Equal by the hash of every state to the same hour begun at 0 and run in the blocks of a file."""
    hashes = []
    for begins, block in ((2**32 - 1000, 128), (0, 16384)):
        lanes = [Lane(realized(form, format), 1) for form, format in (("direct-1", "float32"), ("transposed-2", "Q1.23"))]
        host = Host(lanes, block, device=Device(0, 1), source=generated("white", RATE, 1), begins=begins)
        for k in range(60):
            host.plan.change(Change(k * 60 * RATE + 777, k % 2, ("carry", "warm", "cold")[k % 3]))
        run_on_clock(host, 3600 * RATE, real_time=False)
        hashes.append([lane.state_hash() for lane in lanes])
        assert len(host.plan.changed) == 60
    assert hashes[0] == hashes[1]


# As a sound card drives it


def test_a_card_may_ask_for_more_frames_than_a_block_and_tells_of_gaps() -> None:
    """The callback of PortAudio: in, out, frames, time, flags (1, 2 input; 4, 8 output under- and overflow), user data."""
    width, x = 2, X[:1000].astype(np.float32)
    memory = bytearray(layout(width, width, 256, 0).itemsize)  # as of memory that processes share
    host = Host([Lane(realized("direct-1", "float32"), 2)], 64, device=Device(2, 2, float32=True), guard=Guard(start_db=0.0),
                shared=Shared(width, width, 256, 0, memory))
    host.come_up()
    out, call = np.zeros_like(x), SIGNATURE(host.callback)
    for start, end, flags in ((0, 700, 4), (700, 701, 2), (701, 1000, 16)):
        assert call(x[start:].ctypes.data, out[start:].ctypes.data, end - start, None, flags, host.address) == 0
    alone = fresh(realized("direct-1", "float32"), x.astype(np.float64))
    assert out.tobytes() == alone.astype(np.float32).tobytes()
    seen = Shared(width, width, 256, 0, memory)
    meters = seen.meters[0]
    assert (meters["callbacks"], meters["frame"], meters["output_gaps"], meters["input_gaps"]) == (3, 1000, 1, 1)
    assert np.array_equal(np.roll(seen.heard, -1000, axis=0), alone[-256:])
    seen.control["mute"] = 1
    assert call(x.ctypes.data, out.ctypes.data, 1000, None, 0, host.address) == 0
    assert not out.any()


# Coefficients, lanes, what is planned


def test_a_ramp_takes_its_coefficients_every_32_frames_under_the_state_that_is() -> None:
    steps = [realized("direct-1", "float32", 1000.0 + 100 * k) for k in range(6)]
    lane = Lane(steps[0], 2)
    host = Host([lane], 6000)
    host.plan.move(0, steps[1:], 70)  # begins at the next multiple of 32, which is 96
    host.step(X)
    moved = Lane(steps[0], 2)
    parts, alone = [], Host([moved], 6000)
    for k, (start, end) in enumerate([(0, 96), (96, 128), (128, 160), (160, 192), (192, 224), (224, 6000)]):
        moved.memory.coefficients[:] = steps[k].memory(2).coefficients
        alone.step(X[start:end])
        parts.append(moved.output.copy())
    assert lane.output.tobytes() == np.concatenate(parts).tobytes()
    assert ramp(lambda value: value, 1000.0, 1600.0, 161)[-2:] == [1500.0, 1600.0]  # type: ignore[arg-type, return-value]
    assert len(ramp(lambda value: value, 1000.0, 1600.0, 161)) == 6  # type: ignore[arg-type, return-value]
    with pytest.raises(RequestError, match="another diagram or other words"):
        host.plan.move(0, [realized("direct-2", "float32")])


def test_what_is_prepared_lives_until_the_step_has_done_with_it_and_no_longer() -> None:
    lane = Lane(realized("direct-1", "float32", 1000.0), 2)
    host, known = Host([lane], 6000), []
    for frame in (100, 300, 500):
        host.plan.move(0, [realized("direct-1", "float32", 1000.0 + frame + k) for k in range(4)], frame)
        known.append(weakref.ref(lane.banks))
    for frames, alive in ((50, 3), (100, 3), (200, 2), (300, 1)):
        host.step(X[:frames])
        host.plan.tend()
        assert sum(each() is not None for each in known) == alive
    ended = Lane(realized("direct-1", "float32", 1503.0), 2)
    assert lane.memory.coefficients.tobytes() == ended.memory.coefficients.tobytes()


def test_a_lane_that_is_placed_runs_from_its_frame_on() -> None:
    host = Host([Lane(realized("direct-1"), 2)], 6000)
    host.step(X[:100])
    slot = host.plan.place(Lane(realized("transposed-2"), 2), frame=150)
    host.plan.change(Change(300, slot, "warm"))
    host.step(X[100:])
    assert host.heard_block[200:].tobytes() == fresh(realized("transposed-2"), X[150:])[150:].tobytes()
    with pytest.raises(RequestError, match="Lane 2 is heard"):
        host.plan.place(Lane(realized("direct-1"), 2), 1)
    host.plan.tend()


def test_a_change_that_comes_late_is_made_at_once_and_logged_where_it_was() -> None:
    host = Host([Lane(realized("direct-1"), 2), Lane(realized("transposed-2"), 2)], 64)
    host.step(X[:64])
    host.plan.change(Change(10, 1, "warm"))
    host.step(X[64:128])
    assert host.plan.changed == (Changed(64, 1, 0, "warm", 0),)
    assert host.heard == 1


def test_what_cannot_be_planned_is_refused_and_says_why() -> None:
    host = Host([Lane(realized("direct-1"), 2), Lane(realized("transposed-2"), 2)], 64, waiting=2)
    for change, said in (
        (Change(0, 2, "warm"), "no lane 3: lanes are counted from 1 to 2"),
        (Change(0, 1, "keep"), "the two differ in diagram or words"),
        (Change(0, 1, "wram"), 'no changeover "wram".*Did you mean "warm"'),
    ):
        with pytest.raises(RequestError, match=said):
            host.plan.change(change)
    host.plan.change(Change(50, 1, "warm"))
    with pytest.raises(RequestError, match="comes before one that is planned for frame 50"):
        host.plan.change(Change(49, 0, "warm"))
    host.plan.change(Change(51, 0, "warm"))
    with pytest.raises(RequestError, match="2 changes wait already"):
        host.plan.change(Change(52, 1, "warm"))
    host.step(X[:64])
    host.plan.change(Change(70, 1, "warm"))


@pytest.mark.parametrize("text", ["", "1:2", "x:1:warm", "1:x:warm", "1:1:hot", "-1:1:warm", "1:0:warm", "1:4:warm"])
def test_a_change_that_is_misspelt_is_refused(text: str) -> None:
    with pytest.raises(RequestError, match=f'"{text}"'):
        parse_change(text, 3)
    assert parse_change("48000:2:carry", 3) == Change(48000, 1, "carry")
