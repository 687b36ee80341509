"""The instrument `transients`: known clicks, steps and decays are read back; changes are those that the host makes."""

from functools import cache
from math import exp, log, log10

import numpy as np
import pytest
from switched_runs import switched

import streamhost as sh
from streamhost import Fixed, load_preset
from streamhost.commands.documents import document_of
from streamhost.commands.instruments import limit_verdicts
from streamhost.commands.measuring.transients import lines, waves
from streamhost.errors import RequestError
from streamhost.host import Host, Lane
from streamhost.measure import transients
from streamhost.measure.changes import Target, form_targets, parameter_targets, to_setting
from streamhost.measure.changes.changing import RAMP, Changing
from streamhost.measure.changes.figures import click, figures, heard_click
from streamhost.presets.realizing import realize_preset
from streamhost.presets.tables import CHANGEOVERS
from streamhost.signals import sine, white

RATE = 48000
QUIET = -200.0  # dBFS: below any rounding of what is read here
Q23 = Fixed("Q1.23", coefficients="Q2.30")

SHELF = """
rate = 48000

[[filter]]
kind = "low-shelf"
frequency = 110.0
gain_db = 3.0

[structure]
form = "direct-1"

[format]
signal = "Q1.23"
coefficients = "Q2.30"
"""


@cache
def low_pass(frequency, form, format="float64"):
    filter = sh.design("low-pass", rate=RATE, frequency=frequency, q=2**-0.5)
    return sh.realize(filter, form=form, format=Q23 if format == "Q1.23" else format)


@cache
def gain(value):
    return sh.realize(sh.Filter.from_coefficients([value], rate=RATE), form="direct-1")


def dbfs(peak):
    return 20 * log10(peak)


@pytest.fixture
def shelf(tmp_path):
    def write(limits=""):
        path = tmp_path / "shelf.toml"
        path.write_text(SHELF.replace("gain_db", 'q = 0.7\ngain_db') + limits, encoding="utf-8")
        return load_preset(path)

    return write


# What is injected is read back


def test_a_click_of_known_size_is_read_back():
    deviation = np.zeros((4800, 3))
    deviation[100], deviation[101] = [0.25, 0.001, 0.0], [-0.125, 0.0, 0.0]
    told = figures(deviation, 0.0, RATE)
    assert told.peak.tolist() == [0.25, 0.001, 0.0]
    assert 10 * np.log10(told.energy[:2]) == pytest.approx(
        [10 * log10(2 * (0.25**2 + 0.125**2) / RATE), 10 * log10(2e-6 / RATE)], abs=1e-9)
    assert told.settling.tolist() == [102, 101, 0]
    # The readings scale with the click, from 96 dB down to nothing.
    assert dbfs(told.click[1]) == pytest.approx(dbfs(figures(deviation[:, 1:2] * 1e-4, 0.0, RATE).click[0]) + 80, abs=1e-6)
    assert told.click[2] == 0.0


def test_a_click_reads_as_the_recommendation_has_it():
    """ITU-R BS.468-4: a steady sine reads its level, at 2 kHz 5.6 dB more (Table 1)."""
    for hertz, reads_db in ((1000.0, 0.0), (2000.0, 5.6)):
        assert dbfs(click(sine(2 * RATE, RATE, hertz, -20.0), RATE)[0]) == pytest.approx(-20.0 + reads_db, abs=0.05)


def test_a_known_decay_has_its_known_settling_time_and_energy():
    tau, size, noise = 1000.0, 0.1, 1e-4
    n = np.arange(20000)
    told = figures(size * np.exp(-n / tau)[:, None], noise, RATE)
    assert abs(told.settling[0] - tau * log(size / noise)) <= 1.0
    # a geometric series, as far as it lies above the noise
    ratio = exp(-2 / tau)
    energy = 2 * size**2 * (1 - ratio ** told.settling[0]) / (1 - ratio) / RATE
    assert 10 * log10(told.energy[0]) == pytest.approx(10 * log10(energy), abs=1e-9)


def test_what_runs_away_is_infinite_and_disturbs_no_other_column():
    deviation = np.ones((100, 2))
    deviation[50, 0] = np.nan
    told = figures(deviation, 0.0, RATE)
    assert told.peak.tolist() == [np.inf, 1.0] and told.click[0] == np.inf > told.click[1] > 0.0


def test_the_end_of_a_run_is_no_click():
    heard = np.linspace(0.0, 0.5, RATE)[:, None] ** 2  # slowly up, and there it ends
    step = np.full((RATE, 1), 0.5)
    assert dbfs(heard_click(np.zeros(1), heard, RATE)) < dbfs(heard_click(np.zeros(1), step, RATE)) - 50.0
    assert heard_click(np.full(1, 0.5), step, RATE) == 0.0


def test_a_step_of_known_size_is_read_through_the_whole_instrument():
    """From a gain of 0.5 to 0.25: on a constant of -20 dBFS the output falls by 0.025."""
    found = transients(gain(0.5), targets=[Target("half", "parameter", gain(0.25))], over_ms=10.0)
    by = {each.changeover: each for each in found.changes if each.signal == "constant"}
    assert by["warm"].jump_dbfs == pytest.approx(dbfs(0.1 * 0.25), abs=0.05)
    assert by["keep"].peak_dbfs == -np.inf and by["keep"].settling_frames == 0
    assert by["fade"].peak_dbfs == pytest.approx(dbfs(0.1 * 0.25 * 480 / 481), abs=1e-4)
    assert by["fade"].settling_frames == 480 and by["fade"].settling_ms == pytest.approx(10.0)
    tone = next(each for each in found.changes if each.signal.startswith("tone") and each.changeover == "warm")
    assert tone.jump_dbfs == pytest.approx(dbfs(0.1 * 0.25), abs=0.05)  # at one of four phases it is near its peak


def test_the_settling_time_of_a_cold_start_is_that_of_its_pole():
    """One pole at p forgets as p^n; the noise is q^2 / 12 through 1 / (1 - p^2), rms (Oppenheim & Schafer, ch. 6)."""
    p = 0.9375
    one_pole = sh.Filter.from_coefficients([1 - p], [1, -p], rate=RATE)
    first, second = (sh.realize(one_pole, form=form, format=Q23) for form in ("transposed-2", "direct-1"))
    found = transients(first, targets=[Target("cold", "parameter", second)], changeover="cold", judged_only=True)
    cold = next(each for each in found.changes if each.signal == "constant")
    rms = 2.0**-23 / 12**0.5 / (1 - p * p) ** 0.5
    assert cold.noise_dbfs == pytest.approx(dbfs(rms * 2**0.5), abs=0.05)
    expected = log(0.1 * p / (8 * rms)) / -log(p)
    # half an LSB over 1 - p, 8 LSB, is what rounding may add to what is compared with 8 rms, 6.6 LSB
    early, late = log(0.1 * p / (8 * rms + 16 * 2.0**-23)) / -log(p), expected + 60
    assert cold.peak_dbfs == pytest.approx(dbfs(0.1 * p), abs=0.001)
    assert cold.settling_frames is not None and early - 2 <= cold.settling_frames <= late


# The changes are the host's


@pytest.mark.parametrize(("form", "first", "largest"), [("direct-1", 1.0, 1.0), ("direct-2", 0.010880, 1.0427)])
def test_keep_on_a_constant_depends_on_the_form(form, first, largest):
    """Two filters of gain 1 at 0 Hz: direct form 1 holds inputs and outputs and has no transient, the states of direct form 2
    are x / A(1). Computed for this project by direct simulation, input 1, low-pass 1 kHz to 100 Hz, q = 0.7071, 48 kHz; topic
    of Zetterberg & Zhang 1988, Rabenstein 1988, Valimaki & Laakso, IEEE SP 46 (1998)."""
    change = Changing(low_pass(1000.0, form), low_pass(100.0, form)).on(np.ones((8000, 1)), 4000)
    heard, _ = change.after("keep", 0)
    if form == "direct-1":
        assert np.abs(heard - 1.0).max() < 1e-11  # rounding of float64 through 1 / A(1), some 6,000
    assert heard[0, 0] == pytest.approx(first, abs=5e-7)
    assert heard.max() == pytest.approx(largest, abs=5e-5)


@pytest.mark.parametrize("format", ["float64", "Q1.23"])
@pytest.mark.parametrize("changeover", ["keep", "cold", "carry", "warm", "fade"])
def test_every_changeover_is_that_of_the_host_to_the_bit(changeover, format):
    before, after = low_pass(1000.0, "direct-1", format), low_pass(1400.0, "direct-1", format)
    x = white(3000, 2, 3, -6.0)
    change = Changing(before, after).on(x, 1234)
    heard, clipped = change.after(changeover, 500)
    host = switched(before, after, x, 1234, changeover, fade_frames=500)
    assert heard.tobytes() == host.output[1234:].tobytes() and clipped == host.clipped
    assert change.target.tobytes() == host.target.tobytes() and change.before.tobytes() == host.before.tobytes()


def test_carry_to_another_form_is_that_of_the_host_to_the_bit():
    before, after = low_pass(1000.0, "direct-1", "Q1.23"), low_pass(1000.0, "transposed-2", "Q1.23")
    x = white(3000, 2, 3, -6.0)
    heard, _ = Changing(before, after).on(x, 1234).after("carry", 0)
    assert heard.tobytes() == switched(before, after, x, 1234, "carry").output[1234:].tobytes()


def test_a_ramp_is_that_of_the_host_to_the_bit():
    way = [low_pass(1000.0 * 1.4 ** (k / 4), "direct-1", "Q1.23") for k in range(5)]
    x, at = white(3200, 2, 3, -6.0), 1280
    heard, _ = Changing(way[0], way[-1], way[1:]).on(x, at).after(RAMP, 128)
    host = Host([Lane(way[0], 2)])
    host.plan.move(0, way[1:], at)
    host.step(x)
    assert heard.tobytes() == host.heard_block[at:].tobytes()


# What is changed to, and what is said


def test_neighbours_are_told_and_what_cannot_be_has_its_reason(shelf):
    preset = shelf()
    targets = parameter_targets(preset, realize_preset(preset))
    assert [each.change for each in targets] == [
        "filter.frequency 110 Hz to 138.6 Hz", "filter.frequency 110 Hz to 87.31 Hz", "filter.gain_db 3 dB to 6 dB",
        "filter.gain_db 3 dB to 0 dB", "filter.q 0.7 to 0.9899", "filter.q 0.7 to 0.495"]
    assert {each.tone_hz for each in targets} == {110.0}
    given = to_setting(preset, realize_preset(preset), "filter.gain_db", 500.0)
    assert given.realization is None and "gain_db = 500" in given.reason
    found = transients(realize_preset(preset), targets=[given], quick=True)
    assert found.peak_dbfs is None and given.reason in found.reason
    assert given.reason in "\n".join(lines(found))
    with pytest.raises(RequestError, match=r'no parameter "filter.slope" to change: filter\.frequency, '):
        to_setting(preset, realize_preset(preset), "filter.slope", 1.0)


def test_all_of_it_on_a_shelf(shelf):
    preset = shelf()
    realization = realize_preset(preset)
    targets = [*parameter_targets(preset, realization)[:1], *form_targets(realization, ["transposed-2"])]
    found = transients(realization, white(RATE // 2, 2, 5, -20.0), targets=targets)
    tried = {(each.change, each.changeover) for each in found.changes}
    assert tried == {(targets[0].change, each) for each in CHANGEOVERS} | {
        (targets[1].change, each) for each in CHANGEOVERS if each != RAMP}
    refused = [each for each in found.changes if each.reason]
    assert [(each.kind, each.changeover) for each in refused] == [("form", "keep")]  # two forms have not one state
    for each in found.changes:
        assert each.reason or (each.click_468_dbfs is not None and each.jump_dbfs is not None)
        assert (each.heard_click_468_dbfs is not None) == (each.signal == "constant")
        assert (each.frame is not None) == (each.signal == "recording")
        if each.changeover == "warm":
            assert each.peak_dbfs == -np.inf
    kept = [each for each in found.changes if each.kind == "parameter" and each.changeover == "keep"]
    assert found.click_468_dbfs == max(each.click_468_dbfs for each in kept)
    assert [trace.changeover for trace in found.traces] == list(CHANGEOVERS)
    ramp, keep = ({each.signal: each for each in found.changes if each.kind == "parameter" and each.changeover == by}
                  for by in (RAMP, "keep"))
    assert ramp["tone 110 Hz"].jump_dbfs < keep["tone 110 Hz"].jump_dbfs - 6.0  # the first step is a 30th of the way
    told = "\n".join(lines(found))
    assert targets[0].change in told and "ramp 20 ms" in told and "a state cannot be kept" in told
    audio = {wave.name: wave.samples for wave in waves(found)}
    assert audio["keep"].shape[1] == 1
    raised = next(samples for name, samples in audio.items() if name.startswith("keep-deviation"))
    assert -13.0 <= dbfs(np.abs(raised).max()) <= -12.0
    document = document_of(found)
    assert "traces" not in document and len(document["changes"]) == len(found.changes)


def test_a_stated_frame_is_the_one_that_is_changed_at(shelf):
    preset = shelf()
    realization = realize_preset(preset)
    targets = parameter_targets(preset, realization)[:1]
    x = np.zeros((RATE // 2, 1))
    x[: RATE // 4] = white(RATE // 4, 1, 5, -20.0)
    found = [next(each for each in transients(realization, x, targets=targets, frame=frame, judged_only=True).changes
                  if each.signal == "recording") for frame in (RATE // 8, RATE // 2 - 1)]
    assert [each.frame for each in found] == [RATE // 8, RATE // 2 - 1]
    assert found[0].click_468_dbfs > found[1].click_468_dbfs + 20.0  # a quarter of a second into silence
    with pytest.raises(RequestError, match=rf"frame = {RATE}: a change is at a frame of the signal, from 0 to {RATE // 2 - 1}"):
        transients(realization, x, targets=targets, frame=RATE)
    with pytest.raises(RequestError, match='no changeover "jump": keep, cold, carry, warm, fade, ramp'):
        transients(realization, x, changeover="jump")


def test_broken_off_it_keeps_what_it_has(shelf):
    preset = shelf()
    realization = realize_preset(preset)
    targets = parameter_targets(preset, realization)

    def report(share, doing):
        if doing != targets[0].change:
            raise KeyboardInterrupt

    found = transients(realization, white(RATE // 4, 1, 5, -20.0), targets=targets, quick=True, report=report)
    assert not found.complete
    assert {each.change for each in found.changes} == {targets[0].change}


def test_limits_are_those_of_the_stated_changeover(shelf):
    limits = "\n[limits]\ntransient_dbfs = -300.0\nclick_dbfs = 0.0\nchangeover = \"{}\"\n"
    keep, warm = (limit_verdicts(preset, realize_preset(preset)) for preset in map(shelf, map(limits.format, ("keep", "warm"))))
    assert [each.meets for each in keep] == [False, True]
    assert keep[0].about.endswith(" by keep")
    assert [each.found for each in warm] == [-np.inf, -np.inf]


def test_a_filter_that_does_not_settle_has_no_figures():
    preset = load_preset("rumble-naive-16-bit")
    realization = realize_preset(preset)
    found = transients(realization, targets=parameter_targets(preset, realization, steps=(1,)), quick=True)
    assert found.click_468_dbfs is None and "does not settle" in found.reason
    assert "does not settle" in "\n".join(lines(found))
