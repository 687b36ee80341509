"""Presets with filters for some channels only, and presets for several rates."""

import pytest

from streamhost.errors import PresetError, RequestError
from streamhost.filters import Filter, design
from streamhost.presets import parse_preset, vary
from streamhost.presets.realizing import realize_preset

HEAD = "rate = 48000\n"
PEAK = 'kind = "peak"\nfrequency = {frequency}\ngain_db = 6\nq = 1\n'


def filter_table(frequency=1000, channels=None, text=None):
    stated = "" if channels is None else f"channels = {channels}\n"
    return f"[[filter]]\n{text or PEAK.format(frequency=frequency)}{stated}"


def peak(frequency, rate=48000):
    return design("peak", rate=rate, frequency=frequency, gain_db=6, q=1)


def wire(sections=1):
    return Filter.from_sections([[1, 0, 0, 1, 0, 0]] * sections, rate=48000)


def problems(text):
    with pytest.raises(PresetError) as caught:
        parse_preset(text)
    return list(caught.value.problems)


# Channels


def test_a_filter_for_one_channel_is_a_wire_on_the_others():
    preset = parse_preset(HEAD + filter_table(300, [2]) + filter_table(4000))
    assert preset.channels == 2
    assert preset.filters(3) == (
        Filter.cascade([wire(), peak(4000)]), Filter.cascade([peak(300), peak(4000)]), Filter.cascade([wire(), peak(4000)]))
    assert preset.filter == preset.filters(2)[0]


def test_tables_of_different_channels_stand_at_one_place():
    preset = parse_preset(HEAD + filter_table(300, [1, 3]) + filter_table(500, [2]) + filter_table(700, [1]))
    first, second, third, fourth = preset.filters(4)
    assert first == Filter.cascade([peak(300), peak(700)])
    assert second == Filter.cascade([peak(500), wire()])
    assert third == Filter.cascade([peak(300), wire()])
    assert fourth == Filter.cascade([wire(), wire()])


def test_without_channels_one_filter_is_for_all():
    preset = parse_preset(HEAD + filter_table(300) + filter_table(500))
    assert preset.channels == 1
    assert preset.filters(6) == (Filter.cascade([peak(300), peak(500)]),)
    assert realize_preset(preset, 6).diagram.channels == 1


def test_what_runs_has_a_column_of_coefficients_for_each_channel_of_the_file():
    preset = parse_preset(HEAD + filter_table(300, [1]))
    assert realize_preset(preset).diagram.channels == 2
    made = realize_preset(preset, 3)
    assert made.diagram.channels == 3
    assert made.filters == (peak(300), wire(), wire())
    rows = dict(zip((slot.label for slot in made.diagram.slots), made.diagram.values.tolist(), strict=True))
    assert [row[1:] for row in rows.values()] == [[float(label == "b0")] * 2 for label in rows]
    assert [row[0] for row in rows.values()] != [row[1] for row in rows.values()]


def test_a_channel_that_the_file_has_not_is_told():
    preset = parse_preset(HEAD + filter_table(300) + filter_table(500, [1, 3]))
    with pytest.raises(PresetError) as caught:
        realize_preset(preset, 2)
    assert caught.value.problems == ("preset:12: channels = [1, 3] names channel 3, and there are 2 channels.",)


def test_wires_beside_codes_are_codes():
    codes = 'sections = { codes = [[100, 0, 0, 0, 0], [50, 0, 0, 0, 0]], word = "Q2.14" }\n'
    preset = parse_preset(HEAD + filter_table(channels=[1], text=codes))
    assert preset.filters(2)[1] == Filter.from_codes([[16384, 0, 0, 0, 0]] * 2, "Q2.14", rate=48000)
    narrow = parse_preset(HEAD + filter_table(channels=[1], text=codes.replace("Q2.14", "Q1.15")))
    with pytest.raises(PresetError, match=r"multiplies by 1, which is no code of Q1\.15"):
        realize_preset(narrow, 2)


CROSSOVER = 'kind = "linkwitz-riley"\norder = 4\nfrequency = {frequency}\n'


def test_channels_may_cross_over_at_frequencies_of_their_own():
    preset = parse_preset(HEAD + filter_table(channels=[1], text=CROSSOVER.format(frequency=1000))
                          + filter_table(channels=[2], text=CROSSOVER.format(frequency=2000)))
    assert [filter.outputs for filter in preset.filters(2)] == [("low", "high")] * 2
    with pytest.raises(PresetError, match="the outputs low, high are stated for channel 1 only"):
        realize_preset(preset, 3)


CHANNELS = {
    "channels = []\n": "7: channels = [] is not allowed: channels is a list of channels, whole numbers from 1 to 64, for "
                       "instance [1].",
    "channels = [0]\n": "7: channels[0] = 0 is not allowed: channels is a list of channels, whole numbers from 1 to 64, for "
                        "instance [1].",
    "channels = 1\n": "7: channels = 1 is not allowed: channels is a list of channels, whole numbers from 1 to 64, for "
                      "instance [1].",
    "channels = [2, 2]\n": "7: channels = [2, 2] is not allowed: a channel is named once.",
}


@pytest.mark.parametrize("line", CHANNELS)
def test_channels_that_cannot_be(line):
    assert problems(HEAD + filter_table() + line) == [f"preset:{CHANNELS[line]}"]


def test_all_channels_have_the_same_outputs():
    text = HEAD + filter_table(channels=[1], text=CROSSOVER.format(frequency=1000)) + filter_table(500, [2])
    assert problems(text) == [
        "preset:2: the filters of the channels have different outputs; all channels have the same."]


def test_nothing_follows_a_crossover():
    (told,) = problems(HEAD + filter_table(text=CROSSOVER.format(frequency=1000)) + filter_table())
    assert told == (
        "preset:2: a filter with the outputs low, high stands before the end of a cascade; nothing may follow a filter with "
        "several outputs. Put it last."
    )


# Rates

RATES = "rates = [44100, 48000, 96000]\n"


def test_every_rate_has_a_design_of_its_own():
    preset = parse_preset(RATES + filter_table(300) + "[limits]\nband_hz = [20, 20000]\n")
    assert preset.rates == (44100.0, 48000.0, 96000.0)
    assert (preset.rate, preset.filter) == (44100.0, peak(300, 44100))
    assert [preset.at(rate).filter for rate in preset.rates] == [peak(300, rate) for rate in preset.rates]
    assert preset.at(96000).rates == preset.rates
    assert realize_preset(preset.at(48000)).rate == 48000.0


def test_a_rate_that_is_not_stated():
    with pytest.raises(RequestError) as caught:
        parse_preset(RATES + filter_table()).at(88200)
    assert str(caught.value) == "preset: this preset has the rates 44100, 48000 and 96000 Hz, and 88200 Hz is asked for."


def test_a_varied_rate_stands_in_the_place_of_the_rates():
    preset = parse_preset(RATES + filter_table())
    (one,) = vary([preset], ["rate=48000"])
    assert (one.rates, one.filter) == ((48000.0,), peak(1000))
    (two,) = vary([one], ["rates=[32000, 88200]"])
    assert two.rates == (32000.0, 88200.0)


MISTAKES = {
    RATES + HEAD + filter_table(): ["1: rates stands beside rate: state one of them."],
    "rates = []\n" + filter_table():
        ["1: rates = [] is not allowed: rates is a list of numbers of hertz, for instance [44100, 48000, 96000]."],
    "rates = [48000, 48000]\n" + filter_table():
        ["1: rates = [48000.0, 48000.0] is not allowed: sample rates are numbers of hertz above 0, each stated once."],
    "rates = [-1]\n" + filter_table():
        ["1: rates = [-1.0] is not allowed: sample rates are numbers of hertz above 0, each stated once."],
    # told once, though wrong at every rate
    RATES + filter_table(text='kind = "peek"\nfrequency = 1\n'): ["3: kind = \"peek\" is not known"],
    # wrong at one rate only
    RATES + filter_table(23000):
        ["4: frequency = 23000 is not allowed: a number above 0 and below half the rate (22050). (At 44100 Hz.)"],
    RATES + filter_table(25000): [
        "4: frequency = 25000 is not allowed: a number above 0 and below half the rate (22050). (At 44100 Hz.)",
        "4: frequency = 25000 is not allowed: a number above 0 and below half the rate (24000). (At 48000 Hz.)"],
    RATES + filter_table() + "[limits]\nband_hz = [20, 23000]\n":
        ["8: band_hz = [20.0, 23000.0] is not allowed: two numbers of hertz that rise, from 0 to half the rate (22050)."],
}


@pytest.mark.parametrize("text", MISTAKES, ids=range(len(MISTAKES)))
def test_rates_that_cannot_be(text):
    found = problems(text)
    assert len(found) == len(MISTAKES[text])
    for told, wanted in zip(found, MISTAKES[text], strict=True):
        assert told.startswith(f"preset:{wanted}")


WAYS = {
    'equation = "y[n] = x[n]"\n': "equation",
    "b = [1.0]\n": "b and a",
    "sections = [[1, 0, 0, 1, 0, 0]]\n": "sections",
    'sections = { codes = [[1, 0, 0, 0, 0]], word = "Q2.14" }\n': "sections",
    "zeros = [0.5]\npoles = [0.1]\nfactor = 1.0\n": "zeros, poles and factor",
}


@pytest.mark.parametrize("way", WAYS)
def test_numbers_belong_to_one_rate(way):
    (told,) = problems(RATES + filter_table(text=way))
    assert told == (
        f"preset:2: this [[filter]] is stated by {WAYS[way]}: numbers belong to one rate, and the preset has 3 rates. State a "
        "kind, which is designed at each, or one rate."
    )
    assert parse_preset("rates = [48000]\n" + filter_table(text=way)).rates == (48000.0,)
