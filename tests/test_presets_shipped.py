"""The presets that ship: the blocks of a small loudspeaker, each in sound realizations and in naive ones that fail."""

import pytest

from streamhost.filters import design
from streamhost.measure.sameness import different
from streamhost.presets import load_preset
from streamhost.shipped import names, resolve

SOUND = {"rumble-double-state", "rumble-float32"}
NAIVE = {
    "rumble-naive-16-bit", "rumble-naive-16-bit-state", "rumble-naive-24-bit", "rumble-naive-shared-delays",
}
ASKED = {  # what the design review asks of a block
    block: {"noise_dbfs": -92.0, "response_deviation_db": 0.1, "band_hz": (20.0, 20000.0)}
    for block in ("rumble", "bass", "equalizer", "level", "crossover", "treble", "meter")
} | {"hum": {"noise_dbfs": -85.0, "response_deviation_db": 0.1, "band_hz": (55.0, 20000.0)}}


def shipped(name):
    return load_preset(resolve(name, "preset"))


@pytest.mark.parametrize("name", names("preset"))
def test_every_shipped_preset_loads_and_says_why_it_is_there(name):
    preset = shipped(name)
    assert preset.title
    first, second = preset.path.read_text(encoding="utf-8").splitlines()[:2]
    assert first.startswith("# ")
    assert second.startswith("# ")


def test_the_rumble_filter_is_one_filter_in_six_realizations():
    presets = [shipped(name) for name in sorted(SOUND | NAIVE)]
    assert {preset.filter for preset in presets} == {design("high-pass", rate=48000, frequency=28.0, q=0.707)}
    assert len({(preset.form, preset.format) for preset in presets}) == 6


@pytest.mark.parametrize("block", sorted(ASKED))
def test_the_presets_of_a_block_ask_for_one_filter(block):
    """But for the two kinds of smoother."""
    presets = [shipped(name) for name in names("preset") if name.startswith(block)]
    if block == "level":
        smoothers = [[preset.filter] for preset in presets if preset.filter.order == 1]
        assert len(smoothers) == 2
        assert different(smoothers) == []
        presets = [preset for preset in presets if preset.filter.order > 1]
    assert len(presets) >= 2
    assert different([[preset.filter] for preset in presets]) == []
    assert len({(preset.form, preset.decomposition, preset.format, preset.filter) for preset in presets}) == len(presets)


@pytest.mark.parametrize("name", names("preset"))
def test_only_those_that_are_to_ship_state_what_the_design_review_asks(name):
    assert shipped(name).limits == ({} if "naive" in name else ASKED[name.split("-")[0]])


@pytest.mark.parametrize("name", names("preset"))
def test_those_that_fail_say_so_in_name_title_and_comment(name):
    preset = shipped(name)
    fails = "naive" in name
    assert preset.title.endswith("(fails)") == fails
    assert preset.path.read_text(encoding="utf-8").startswith("# FAILS") == fails


def test_with_16_bit_coefficients_the_filter_has_a_pole_on_the_unit_circle_at_0_hz():
    # The filter's two denominator coefficients at 14 fraction bits, which is what 16 bits leave beside -1.99.
    _, a1, a2 = shipped("rumble-naive-16-bit").filter.whole()[1]
    one = 2**14
    assert one + round(a1 * one) + round(a2 * one) == 0
    assert 1 + a1 + a2 > 0
