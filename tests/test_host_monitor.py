"""What comes in and what goes out: sources, the difference, the monitor's gain, the output guard, the recording."""

import time
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from test_host_step import divided

import streamhost as sh
from streamhost import signals
from streamhost.errors import RequestError
from streamhost.files import AudioWriter, read_all
from streamhost.host import Change, Device, Guard, Host, Lane
from streamhost.host.capturing import captured
from streamhost.host.figures import guard_figures, percentile_ns
from streamhost.host.recording import Recorder
from streamhost.host.records import BINS
from streamhost.host.sources import Source, generated, looped, pink_sections
from streamhost.measure.running import Run
from streamhost.realization import Realization

RATE = 48000
WIRE = sh.realize(sh.Filter.from_coefficients([1.0], [1.0], rate=RATE), form="direct-1")
OPEN = Guard(start_db=0.0)


def sent(host: Host, x: np.ndarray) -> np.ndarray:
    """What the guard lets out of the whole signal in one block."""
    out = np.zeros((len(x), host.device.outputs), host.device.dtype)
    host.step(x, out)
    return out


def wire(channels: int = 1, **how: object) -> Host:
    return Host([Lane(WIRE, channels)], 1 << 16, device=Device(channels, channels), **how)  # type: ignore[arg-type]


# Sources


def made(source: Source, frames: int, channels: int = 2, lengths: tuple[int, ...] = (1 << 16,)) -> np.ndarray:
    host = Host([Lane(WIRE, channels)], 1 << 16, device=Device(0, channels), source=source)
    parts = []
    for block in divided(np.zeros((frames, channels)), list(lengths)):
        host.step(None, np.zeros((len(block), channels)))
        parts.append(host.heard_block.copy())
    return np.concatenate(parts)


SIGNALS = {
    "silence": lambda n: signals.silence(n, 2),
    "tone:1000@-3": lambda n: signals.sine(n, RATE, 1000.0, -3.0, 2),
    "tone:23999@-3": lambda n: signals.sine(n, RATE, 23999.0, -3.0, 2),
    "white@-10": lambda n: signals.white(n, 2, 1, -10.0),
    "sweep:20,20000,0.05@-6": lambda n: np.concatenate([signals.sweep(2400, RATE, (20.0, 20000.0), -6.0, 2)] * 3)[:n],
    "dc:-0.25": lambda n: signals.dc(n, -0.25, 2),
    "impulses:0.025@0": lambda n: np.concatenate([signals.impulse(1200, channels=2)] * 5)[:n],
}


@pytest.mark.parametrize("text", sorted(SIGNALS))
def test_a_generator_gives_the_test_signals_to_the_bit(text: str) -> None:
    x = made(generated(text, RATE, 2), 5000)
    assert x.tobytes() == SIGNALS[text](5000).tobytes()
    assert made(generated(text, RATE, 2), 5000, lengths=(7, 64, 1)).tobytes() == x.tobytes()


def test_two_tones_are_the_sum_of_both_at_half_the_peak() -> None:
    half = signals.peak_code(-20.0) // 2 / signals.FULL_SCALE
    n = np.arange(4000)[:, np.newaxis]
    wanted = half * (np.sin(2 * np.pi * 60 * n / RATE) + np.sin(2 * np.pi * 7000 * n / RATE))
    # Two roundings of half a code each, on top of the sine's own 3e-16 and that of numpy's argument of up to 3700.
    np.testing.assert_allclose(made(generated("tones:60,7000", RATE, 1), 4000, 1), wanted, atol=1.001 * 2.0**-23)


def test_pink_noise_falls_by_3_db_an_octave() -> None:
    z = np.exp(-2j * np.pi * np.array([20.0 * 2**k for k in range(10)]) / RATE)
    gains = np.prod([np.abs((1 - zero * z) / (1 - pole * z)) for zero, pole in pink_sections(RATE)], axis=0)
    slope = 20 * np.log10(gains) + 10 * np.log10(2.0) * np.arange(10)
    assert np.abs(slope - slope.mean()).max() < 0.6  # what the docstring says
    x = made(generated("pink@-10", RATE, 2), 48000)
    assert np.abs(x).max() <= signals.peak_code(-10.0) / signals.FULL_SCALE
    assert x.tobytes() == made(generated("pink@-10", RATE, 2), 48000, lengths=(64,)).tobytes()
    assert np.array_equal(np.rint(x * 2.0**23), x * 2.0**23)  # 24-bit codes
    # rms 13 dB below the peak; its power below 20 Hz makes a second of it scatter by a decibel
    assert 20 * np.log10(np.sqrt((x**2).mean())) == pytest.approx(-23.0, abs=1.5)


def test_a_file_goes_round_and_round() -> None:
    data = np.random.default_rng(1).uniform(-1, 1, (77, 2))
    assert made(looped(data, "it"), 1000, lengths=(13,)).tobytes() == np.tile(data, (13, 1))[:1000].tobytes()


@pytest.mark.parametrize("text", ["", "hum", "tone", "tone:x", "tone:24000", "tones:60", "dc:2", "white@3", "sweep:20,20000,0"])
def test_a_source_that_cannot_be_is_refused(text: str) -> None:
    with pytest.raises(RequestError):
        generated(text, RATE, 2)


# Difference


def shelving(format: str) -> Realization:
    filter = sh.design("peak", rate=RATE, frequency=1000, gain_db=6, q=0.7)
    return sh.realize(filter, form="direct-1", format=format)


@pytest.mark.parametrize("format", ["float32", "24x24+56", "float64"])
def test_the_difference_is_what_a_measurement_calls_so_raised_by_its_gain(format: str) -> None:
    """float64 is judged in double-double, the others in float64."""
    x = np.random.default_rng(3).uniform(-0.4, 0.4, (3000, 2))
    host = Host([Lane(shelving(format), 2, ideal=True)], 4096, device=Device(2, 2), guard=OPEN)
    host.plan.subtract("ideal", 20 * np.log10(2.0**12))
    host.come_up()
    measured = Run(shelving(format), 2).step(x).difference[:, 0]
    assert np.abs(measured).max() > 0
    # 10^(20 log10 2^12 / 20) comes back to within a few last places
    np.testing.assert_allclose(sent(host, x), measured * 2.0**12, rtol=1e-14)


def test_the_difference_of_two_lanes_and_of_nothing() -> None:
    x = np.random.default_rng(3).uniform(-0.4, 0.4, (3000, 2))
    host = Host([Lane(shelving("float64"), 2), Lane(WIRE, 2)], 4096, device=Device(2, 2), guard=OPEN)
    host.come_up()
    host.plan.subtract(1, frame=1000)
    host.plan.subtract(None, frame=2000)
    out, y = sent(host, x), host.lanes[0].output
    assert out.tobytes() == np.concatenate([y[:1000], y[1000:2000] - x[1000:2000], y[2000:]]).tobytes()


def test_no_gain_on_the_difference_exceeds_the_ceiling() -> None:
    host = Host([Lane(shelving("float32"), 2, ideal=True)], 4096, device=Device(2, 2), guard=Guard(-6.0, start_db=0.0))
    host.plan.subtract("ideal", 130.0)
    host.come_up()
    out = sent(host, np.random.default_rng(3).uniform(-0.4, 0.4, (3000, 2)))
    ceiling = float(host.shared.control["ceiling"][0])
    assert np.abs(out).max() == ceiling <= 10 ** (-6 / 20)
    assert guard_figures(host.shared).held > 0


# Monitor and guard


def test_the_output_begins_muted_and_comes_up_by_a_ramp() -> None:
    host = wire(guard=Guard(start_db=-60.0, rise_db_per_s=600.0))
    ones = np.full((9600, 1), 0.5)
    assert not sent(host, ones).any()
    host.set_monitor(-6.0)
    host.come_up()
    out = sent(host, ones)[:, 0]
    assert out[0] == pytest.approx(0.5e-3, rel=2e-3)  # one frame's rise is 0.0125 dB
    assert (np.diff(out) >= 0).all()
    # 54 dB at 600 dB a second are 4320 frames
    assert np.flatnonzero(out == out[-1])[0] == pytest.approx(4320, abs=2)
    assert out[-1] == 0.5 * 10 ** (-6 / 20)
    assert guard_figures(host.shared).state == "sounding"
    host.mute()
    assert not sent(host, ones).any()
    assert guard_figures(host.shared).state == "muted"


def test_at_0_db_what_is_heard_goes_out_to_the_bit() -> None:
    x = np.random.default_rng(3).uniform(-1, 1, (3000, 2))
    host = wire(2, guard=OPEN)
    host.come_up()
    assert sent(host, x).tobytes() == x.tobytes()
    host = Host([Lane(WIRE, 1)], 4096, device=Device(1, 2, float32=True), guard=OPEN)
    host.shared.control["counter_channel"] = 1
    host.come_up()
    out = sent(host, x[:, :1])
    assert out[:, 0].tobytes() == x[:, 0].astype(np.float32).tobytes()
    assert np.array_equal(out[:, 1] * 2**24, np.arange(3000))


@pytest.mark.parametrize(("value", "reason"), [(np.inf, "infinity"), (-np.inf, "infinity"), (150.0, "runaway level")])
def test_what_is_wrong_mutes_at_once_until_told_to_come_up(value: float, reason: str) -> None:
    host = wire(2, guard=OPEN)
    host.come_up()
    x = np.full((1000, 2), 0.25)
    x[500, 1] = value
    out = sent(host, x)
    assert (out[:500] == 0.25).all()
    assert not out[500:].any()
    figures = guard_figures(host.shared)
    assert (figures.state, figures.reason, figures.frame, figures.lane) == ("guard shut", reason, 500, 0)
    assert not sent(host, x[:100]).any()
    host.come_up()
    assert (sent(host, x[:100]) == 0.25).all()


def test_nan_mutes() -> None:
    """Doors let no NaN in, but 0 times infinity makes one."""
    filter = sh.Filter.from_coefficients([0.0, 1.0], [1.0], rate=RATE)
    host = Host([Lane(sh.realize(filter, form="direct-1"), 1)], 64, device=Device(1, 1), guard=OPEN)
    host.come_up()
    assert not sent(host, np.array([[np.inf], [0.5], [0.5]])).any()
    assert guard_figures(host.shared).reason == "NaN"


def test_sustained_full_scale_mutes_and_a_full_scale_sine_does_not() -> None:
    host = wire(guard=OPEN)
    host.come_up()
    assert sent(host, signals.sine(60000, RATE, 50.0, 0.0))[-1] != 0
    square = np.sign(signals.sine(60000, RATE, 50.0, 0.0) + 1e-9)
    out = sent(host, square)
    # half a second without a quiet frame; the sine before it has left nothing to count down
    assert np.flatnonzero(out == 0)[0] == pytest.approx(24000, abs=5)
    assert guard_figures(host.shared).reason == "sustained full scale"


def test_of_10000_unstable_and_overflowing_lanes_nothing_passes_the_ceiling() -> None:
    """Each gets 16 frames of noise under coefficients of its own; the guard is told to come up again before each."""
    rng = np.random.default_rng(11)
    filter = sh.Filter.from_sections([[0.5, 0.3, 0.1, 1.0, -0.4, 0.6]], rate=RATE)
    wraps = sh.Fixed("Q1.15", coefficients="Q2.14", overflow="wrap")
    lanes = [Lane(sh.realize(filter, form="direct-1"), 1), Lane(sh.realize(filter, form="direct-1", format=wraps), 1)]
    for heard in (0, 1):
        host = Host([lanes[heard]], 16, device=Device(1, 1, float32=True), guard=Guard(-3.0, start_db=0.0))
        coefficients, loudest, shut = lanes[heard].memory.coefficients, 0.0, 0
        out = np.zeros((16, 1), np.float32)
        for _ in range(5000):
            coefficients[:] = rng.uniform(-4, 4, coefficients.shape) * (2**14 if heard else 10.0 ** rng.uniform(-1, 3))
            lanes[heard].reset()
            host.come_up()
            host.step(rng.uniform(-1, 1, (16, 1)), out)
            assert np.isfinite(out).all()
            loudest, shut = max(loudest, float(np.abs(out).max())), shut + (host.shared.meters["state"][0] == 3)
        assert loudest == host.shared.control["ceiling"][0] <= 10 ** (-3 / 20)
        assert shut > 1000 if heard == 0 else guard_figures(host.shared).held > 1000


# Recording, capture, figures


@given(lengths=st.lists(st.sampled_from([1, 64, 100]), min_size=1, max_size=4))
@settings(max_examples=3)
def test_a_recording_holds_what_is_heard_to_the_bit(tmp_path_factory: pytest.TempPathFactory, lengths: list[int]) -> None:
    path = tmp_path_factory.mktemp("recorded") / "it.wav"
    x = np.rint(np.random.default_rng(3).uniform(-1, 1, (3000, 2)) * 2**20) / 2**20
    host = wire(2, recording=4096, guard=Guard())
    with Recorder(host.shared, AudioWriter(path, rate=RATE, channels=2, subtype="float")) as recorder:
        for block in divided(x, lengths):
            sent(host, block)
    assert recorder.lost == 0
    assert np.array_equal(read_all(path)[0], x)


def test_a_disk_that_is_too_slow_costs_frames_that_are_counted_and_no_time() -> None:
    host = wire(2, recording=1000)
    host.shared.control["recording"] = 1  # and nobody empties it
    for _ in range(5):
        sent(host, np.zeros((300, 2)))
    assert int(host.shared.meters["recorded"][0]) == 900
    assert int(host.shared.meters["overruns"][0]) == 600


def test_the_audio_around_a_change_is_kept() -> None:
    x = np.random.default_rng(3).uniform(-1, 1, (4000, 2))
    first, second = shelving("float64"), shelving("float32")
    host = Host([Lane(first, 2), Lane(second, 2)], 64, recent=2048)
    host.plan.change(Change(2000, 1, "warm"))
    heard, outputs = [], ([], [])
    for k, block in enumerate(divided(x, [64])):
        host.step(block)
        heard.append(host.heard_block.copy())
        for kept, lane in zip(outputs, host.lanes, strict=True):
            kept.append(lane.output.copy())
        found = captured(host.shared, 2000, (0, 1), before=100, after=500, block=64)
        assert (found is None) == (64 * (k + 1) < 2500 or 64 * (k + 1) - 1900 > 2048 - 64)
        if found is not None:
            assert found.first == -100
            assert np.array_equal(found.heard, np.concatenate(heard)[1900:2500])
            assert np.array_equal(found.before, np.concatenate(outputs[0])[1900:2500])
            assert np.array_equal(found.after, np.concatenate(outputs[1])[1900:2500])


def test_block_times_are_told_within_3_percent() -> None:
    host = wire(2)
    began = time.perf_counter_ns()
    for _ in range(50):
        sent(host, np.zeros((64, 2)))
    took, meters = time.perf_counter_ns() - began, host.shared.meters[0]
    assert 0 < meters["longest_nanoseconds"] <= meters["nanoseconds"] <= took
    assert 0 < host.lanes[0].nanoseconds < meters["nanoseconds"]
    assert host.shared.histogram.sum() == 50
    for value in (1, 31, 63, 64, 1000, 12345, 10**6, 10**9):
        octave, rest = 0, value
        while rest >= 64:
            octave, rest = octave + 1, rest >> 1
        histogram = np.zeros(BINS, np.int64)
        histogram[octave * 32 + rest] = 1
        assert value <= percentile_ns(histogram, 0.5) <= max(value + 1, value * (1 + 1 / 32) + 1)


def test_a_recorder_tells_of_a_disk_that_fails_at_its_end(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    host = wire(2, recording=4096)
    writer = AudioWriter(tmp_path / "it.wav", rate=RATE, channels=2, subtype="float")

    def fails(block: np.ndarray) -> None:
        raise OSError("no room")

    monkeypatch.setattr(writer, "write", fails)
    with pytest.raises(OSError, match="no room"), Recorder(host.shared, writer):
        sent(host, np.zeros((64, 2)))
    assert list(tmp_path.iterdir()) == []
    assert int(host.shared.control["recording"][0]) == 0
