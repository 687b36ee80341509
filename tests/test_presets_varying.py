"""Families made of presets by varying keys."""

from itertools import product

import pytest

from streamhost.errors import PresetError
from streamhost.filters import design
from streamhost.formats import Fixed
from streamhost.presets import parse_preset, vary

TEXT = """title = "Peak"
rate = 48000
[[filter]]
kind = "peak"
frequency = 1000
gain_db = 6
q = 1
[format]
arithmetic = "16x16+40"
output = "Q1.31"
"""
PEAK = parse_preset(TEXT)
TWO = parse_preset(TEXT + "[[filter]]\nb = [1, -1]\n")


def refused(variations, presets=(PEAK,)):
    with pytest.raises(PresetError) as caught:
        vary(presets, variations)
    (problem,) = caught.value.problems
    return problem


def test_nothing_varied_is_the_presets_as_they_are():
    assert vary([PEAK, TWO], []) == [PEAK, TWO]


def test_every_value_of_one_key_with_every_value_of_the_other():
    made = vary([PEAK], ["structure.form=direct-1,transposed-2", "format.arithmetic=16x16+40,24x24+56"])
    forms, arithmetics = ("direct-1", "transposed-2"), ("16x16+40", "24x24+56")
    assert [(preset.form, preset.format) for preset in made] == [
        (form, Fixed(arithmetic=arithmetic, output="Q1.31")) for form, arithmetic in product(forms, arithmetics)
    ]
    assert [preset.title for preset in made] == [
        "Peak, direct-1, 16x16+40", "Peak, direct-1, 24x24+56",
        "Peak, transposed-2, 16x16+40", "Peak, transposed-2, 24x24+56",
    ]


def test_several_presets_are_varied_one_after_the_other():
    made = vary([PEAK, TWO], ["structure.form=direct-1,direct-2"])
    assert [(len(preset.filter.factors), preset.form) for preset in made] == [
        (1, "direct-1"), (1, "direct-2"), (2, "direct-1"), (2, "direct-2"),
    ]


def test_a_parameter_of_the_filter_is_varied_and_designed_anew():
    made = vary([PEAK], ["filter.q=0.5,2"])
    assert [preset.filter for preset in made] == [
        design("peak", rate=48000, frequency=1000, gain_db=6, q=q) for q in (0.5, 2)
    ]
    assert [preset.title for preset in made] == ["Peak, q 0.5", "Peak, q 2"]


def test_the_rate_is_varied_with_all_that_hangs_on_it():
    low, high = vary([PEAK], ["rate=44100,96000"])
    assert (low.rate, low.filter.rate, high.rate, high.filter.rate) == (44100, 44100, 96000, 96000)


def test_one_of_several_filters_is_named_by_its_number_from_1():
    (made,) = vary([TWO], ["filter.2.b=[1, 1]"])
    assert made.filter.factors == (TWO.filter.factors[0], vary([TWO], ["filter.2.b=[1,1]"])[0].filter.factors[1])
    assert made.filter.factors[1].b == (1.0, 1.0)


def test_values_with_commas_inside_stay_whole():
    made = vary([PEAK], ['format.state={ word = "Q1.31", rounding = "floor" },Q1.15'])
    assert [preset.format for preset in made] == [
        Fixed(arithmetic="16x16+40", output="Q1.31", state={"word": "Q1.31", "rounding": "floor"}),
        Fixed(arithmetic="16x16+40", output="Q1.31", state="Q1.15"),
    ]
    (banded,) = vary([PEAK], ["limits.band_hz=[20, 2000]"])
    assert banded.limits == {"band_hz": (20.0, 2000.0)}


def test_what_is_varied_is_varied_again_and_the_first_is_left_alone():
    (once,) = vary([PEAK], ["structure.form=direct-1"])
    (twice,) = vary([once], ["filter.q=2"])
    assert (twice.title, twice.form) == ("Peak, direct-1, q 2", "direct-1")
    assert (once.filter, PEAK.form, PEAK.filter) == (parse_preset(TEXT).filter, "transposed-2", once.filter)


def test_values_that_look_alike_when_shortened_are_numbered():
    long = ", ".join(["0.125"] * 20)
    made = vary([TWO], [f"filter.2.b=[{long}],[{long}, 1.0],[1.0]"])
    first, second, third = (preset.source.varied[0] for preset in made)
    assert first.startswith("b [0.125, 0.125,")
    assert (first.removesuffix(" (1)"), third) == (second.removesuffix(" (2)"), "b [1.0]")
    assert first != second
    assert [preset.own_title for preset in made] == ["Peak"] * 3


def test_a_value_that_cannot_be_is_told_with_the_line_and_with_what_was_asked():
    assert refused(["filter.q=high"]) == (
        'preset:7: q = "high" is not allowed: a finite number above 0. (Asked for by --vary filter.q=high)'
    )
    assert refused(["rate=1500"]) == (
        "preset:5: frequency = 1000 is not allowed: a number above 0 and below half the rate (750). "
        "(Asked for by --vary rate=1500)"
    )


def test_a_key_that_does_not_exist_is_told_with_the_nearest():
    assert refused(["structure.frm=direct-1"]) == (
        "preset: frm is no key of [structure], which takes form, decomposition, pairing, ordering, scaling or outputs. "
        'Did you mean "form"? (Asked for by --vary structure.frm=direct-1)'
    )


@pytest.mark.parametrize("text", ["structure.form", "=x", "structure.=x", "structure.form=", "structure.form=a,,b"])
def test_what_is_no_variation(text):
    assert refused([text]) == (
        f"--vary {text} is not KEY=VALUE,VALUE, for instance structure.form=direct-1,transposed-2."
    )


def test_one_key_varied_twice():
    assert refused(["filter.q=1", "filter.q=2"]) == (
        "--vary filter.q is given twice: join its values by commas, for instance structure.form=direct-1,transposed-2."
    )


def test_a_key_of_several_filters_needs_their_number():
    assert refused(["filter.q=1"], [TWO]) == (
        "--vary filter.q: preset has no table of that name. It has 2 filters: say which, for instance filter.1.q."
    )


@pytest.mark.parametrize("key", ["filter.3.q", "filter.0.q", "title.text", "filter.b.1"])
def test_a_place_that_is_no_table(key):
    assert refused([f"{key}=1"], [TWO]) == f"--vary {key}: preset has no table of that name."


def test_too_many_at_once():
    many = ",".join(map(str, range(1, 33)))
    assert refused([f"filter.q={many}", f"filter.gain_db={many}"]) == (
        "--vary asks for 1024 realizations, and at most 1000 are made at once."
    )
