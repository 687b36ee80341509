"""The instrument `table`: its figures are those of each setting by itself, its batches those of one change at a time."""

import time
from functools import cache
from itertools import product

import numpy as np
import pytest

import streamhost as sh
from streamhost import load_preset
from streamhost.commands.documents import document_of
from streamhost.commands.measuring.table import lines, waves
from streamhost.errors import PresetError, RequestError
from streamhost.measure import overflow, predicted_noise, response_deviation, table
from streamhost.measure.changes.changing import Changing
from streamhost.measure.changes.figures import figures
from streamhost.measure.settings.grid import grid_of
from streamhost.measure.settings.turning import Pair, lengths, signals_of, turned_all
from streamhost.presets import parse_preset
from streamhost.presets.knobs import knobs, turned
from streamhost.presets.realizing import realize_preset

PEAK = """
rate = 48000

[[filter]]
b = [0.25]

[[filter]]
kind = "peak"
frequency = 200.0
gain_db = 6.0
q = 1.0
{}

[structure]
form = "transposed-2"

[format]
signal = "Q1.15"
coefficients = "Q2.22"
"""
FEW = "positions.gain_db = [0, 6]\npositions.frequency = [100, 200, 400]"


def preset_of(positions=""):
    return parse_preset(PEAK.format(positions))


@cache
def few():
    return table(preset_of(FEW))


# Which settings, and which are neighbours


def test_stated_positions_stand_each_with_each():
    grid = grid_of(preset_of(FEW), 300)
    assert grid.points == tuple((f, g, 1.0) for f, g in product((100.0, 200.0, 400.0), (0.0, 6.0)))
    # 2 x 2 turns of the frequency and 3 of the gain, up and down
    assert len(grid.pairs) == 2 * (2 * 2 + 3 * 1) == len(set(grid.pairs))
    for first, second in grid.pairs:
        assert sum(a != b for a, b in zip(grid.points[first], grid.points[second], strict=True)) == 1
    assert grid.turn(*grid.pairs[0])[0] == "filter.2.gain_db 0 dB to 6 dB"


def test_without_positions_there_are_steps_about_where_the_knobs_stand():
    grid = grid_of(preset_of(), 300)
    frequencies, gains, qs = (sorted({point[k] for point in grid.points}) for k in range(3))
    assert frequencies == pytest.approx([200 * 2 ** (k / 3) for k in range(-3, 4)])  # thirds of an octave to an octave
    assert gains == [float(k) for k in range(13)] and qs == [1.0]
    assert len(grid.points) == 7 * 13
    assert "gains by 1 dB to 6 dB" in grid.steps


def test_steps_become_coarser_until_there_are_few_enough():
    equalizer = load_preset("equalizer-24-bit")
    for most, together in ((24, False), (60, True), (300, True)):
        grid = grid_of(equalizer, most)
        assert most / 3 < len(grid.points) <= most
        assert ("with each other" in grid.steps) == together
        moved = [sum(at != knob.at for knob, at in zip(grid.knobs, point, strict=True)) for point in grid.points]
        assert max(moved) == (2 if together else 1)
        assert tuple(knob.at for knob in knobs(equalizer)) in grid.points  # of all filters, and once
        assert len(set(grid.points)) == len(grid.points)


def test_too_many_positions_are_refused():
    many = list(range(1, 1002))
    with pytest.raises(RequestError, match="its positions make 2002 settings; at most 2000 are tried"):
        table(preset_of(f"positions.gain_db = [0, 6]\npositions.frequency = {many}"))


@pytest.mark.parametrize(("positions", "said"), [
    ("positions = 3", "positions = 3 is not allowed: positions.frequency = "),
    ("positions.gain_db = 3", "positions.gain_db = 3 is not allowed: a list of positions"),
    ("positions.gain_db = []", "positions.gain_db = [] is not allowed: a list of positions"),
    ("positions.gain_db = [0, 500]", "positions.gain_db[1] = 500 is not allowed: a number from -120 to 120"),
    ("positions.gain = [0]", 'frequency, gain_db or q. Did you mean "gain_db"?'),
    ("positions.slope = [1]", "frequency, gain_db or q."),
])
def test_positions_that_cannot_be(positions, said):
    with pytest.raises(PresetError) as refused:
        preset_of(positions)
    assert said in str(refused.value) and "preset:12: " in str(refused.value)


def test_a_filter_without_parameters_has_no_positions():
    with pytest.raises(PresetError, match="it has none"):
        parse_preset("rate = 48000\n[[filter]]\nb = [0.5]\npositions.b = [1]\n")
    found = table(parse_preset("rate = 48000\n[[filter]]\nb = [0.5]\n"))
    assert found.reason == "the preset states no parameter that can be turned" and found.settings == 0
    assert list(lines(found)) == [f"Not asked: {found.reason}."]


# What it finds


def test_figures_are_those_of_each_setting_by_itself():
    preset = preset_of(FEW)
    found = few()
    grid = grid_of(preset, 300)
    each = [realize_preset(turned(preset, zip(grid.knobs, point, strict=True))) for point in grid.points]
    noises = [predicted_noise(realization.program, 48000).dbfs for realization in each]
    assert [one.noise_dbfs for one in found.positions] == pytest.approx(noises, abs=1e-9)
    rooms = [overflow(realization, judged_only=True).headroom_db for realization in each]
    assert [one.headroom_db for one in found.positions] == pytest.approx(rooms, abs=1e-9)
    off = [response_deviation(realization, (20.0, 20000.0)).db for realization in each]
    assert (found.noise_dbfs, found.headroom_db) == pytest.approx((max(noises), min(rooms)), abs=1e-9)
    assert found.deviation_db == pytest.approx(max(off), abs=1e-9)
    assert found.noise_at == found.positions[int(np.argmax(noises))].said
    assert (found.settings, found.turns, found.unstable, found.refused, found.complete) == (6, 14, 0, 0, True)
    assert found.positions[0].at == {"filter.2.frequency": 100.0, "filter.2.gain_db": 0.0, "filter.2.q": 1.0}


def test_the_worst_turn_is_the_one_that_its_trace_shows():
    found = few()
    assert found.trace is not None and found.click_at == found.trace.change
    told = figures(found.trace.deviation[found.trace.at :, None], 0.0, 48000.0)
    assert 20 * np.log10(told.click[0]) == pytest.approx(found.click_468_dbfs, abs=1e-6)
    assert found.worst_turns[0].click_468_dbfs == found.click_468_dbfs
    assert found.peak_dbfs >= found.worst_turns[0].peak_dbfs
    assert {wave.name.split("-")[0] for wave in waves(found)} == {"keep"}
    said = "\n".join(lines(found))
    assert "click by keep" in said and found.click_at in said and "6 settings, 14 turns" in said
    assert "trace" not in document_of(found)


@pytest.mark.parametrize("channels", [1, 2])
def test_a_batch_of_turns_is_each_of_them_alone(channels):
    filters = [sh.design("peak", rate=48000, frequency=f, gain_db=g, q=1.0) for f, g in ((200, 3), (300, 3), (300, -3))]
    given = [[filter] + [filters[0]] * (channels - 1) for filter in filters]
    each = [sh.realize(one[0] if channels == 1 else one, form="direct-1", format=sh.Fixed("Q1.15", coefficients="Q3.13"))
            for one in given]
    pairs = [Pair(each[a], each[b], 200.0, 900.0) for a, b in ((0, 1), (1, 2), (2, 0), (1, 0))]
    for pair, found in zip(pairs, turned_all(pairs), strict=True):
        before, after = lengths(900.0, 48000.0)
        told = []
        for excerpts in signals_of(pair, before, after):
            change = Changing(pair.first, pair.second).on(excerpts.x, before)
            told.append(figures(change.after("keep", 0)[0] - change.target[before:], 0.0, 48000.0))
        assert found.peak == max(one.peak.max() for one in told)
        assert found.click == pytest.approx(max(one.click.max() for one in told), rel=1e-9)  # transforms of another width


def test_what_is_not_stable_is_counted_and_named():
    """1 + a1 + a2 of the 16-bit rumble filter rounds to 0 below some 50 Hz: a pole on z = 1 (README, realization 3)."""
    found = table(load_preset("rumble-naive-16-bit"), quick=True)
    at_28 = [one for one in found.positions if one.at == {"filter.frequency": 28.0, "filter.q": 0.707}]
    assert [one.stability for one in at_28] == ["marginal"] and at_28[0].noise_dbfs is None
    assert found.marginal == sum(one.stability == "marginal" for one in found.positions) > 1
    assert f"{found.marginal} marginal" in "\n".join(lines(found))


def test_what_cannot_be_realized_has_its_reason():
    found = table(parse_preset(PEAK.format("").replace("Q2.22", "Q1.15")), quick=True)
    assert found.refused == found.settings > 0 and found.click_468_dbfs is None
    assert "Refused: " in "\n".join(lines(found))


def test_every_rate_of_the_preset_is_tabled():
    two = PEAK.format(FEW).replace("rate = 48000", "rates = [44100, 96000]").replace("[[filter]]\nb = [0.25]\n", "")
    found = table(parse_preset(two))
    assert [one.rate_hz for one in found.positions] == [44100.0] * 6 + [96000.0] * 6
    assert found.turns == 28 and " Hz at " in found.noise_at


def test_in_floating_point_there_is_neither_headroom_nor_predicted_noise():
    found = table(parse_preset(PEAK.format(FEW).replace('signal = "Q1.15"\ncoefficients = "Q2.22"', 'arithmetic = "float32"')))
    assert found.noise_dbfs is None and found.headroom_db is None and found.click_468_dbfs is not None


@pytest.mark.parametrize("word", ["setting 4 of 6", "turn 1 of 14"])
def test_broken_off_it_keeps_what_it_has(word):
    def report(share, doing):
        assert 0.0 <= share <= 1.0
        if doing == word:
            raise KeyboardInterrupt

    found = table(preset_of(FEW), report=report)
    assert not found.complete and found.noise_dbfs is not None
    assert found.settings == (3 if word.startswith("setting") else 6) and found.turns == 0


@pytest.mark.slow
def test_a_table_of_300_settings_takes_less_than_a_minute():
    positions = f"positions.gain_db = {list(range(-7, 8))}\npositions.frequency = {[50 * 2 ** (k / 3) for k in range(20)]}"
    began = time.process_time()
    assert table(preset_of(positions)).settings == 300
    assert time.process_time() - began < 60.0  # of one processor, whatever else the machine does
