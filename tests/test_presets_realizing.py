"""What a preset states, made to run; refusals name file, line and key."""

import pytest

from streamhost.errors import PresetError
from streamhost.presets import parse_preset, vary
from streamhost.presets.realizing import realize_preset, realize_presets

PEAK = '[[filter]]\nkind = "peak"\nfrequency = 1000.0\ngain_db = 6.0\nq = 1.0\n'


def refused(text, *variations):
    (preset,) = vary([parse_preset(f"rate = 48000\n{text}")], variations)
    with pytest.raises(PresetError) as caught:
        realize_preset(preset)
    (problem,) = caught.value.problems
    return problem


def test_everything_a_preset_states_is_realized():
    text = ('[structure]\nform = "direct-2"\ndecomposition = "cascade"\npairing = "nearest"\nordering = "inward"\n'
            'scaling = "l2"\n[format]\nsignal = "Q1.23"\n')
    preset = parse_preset(f"rate = 48000\n{PEAK}{text}")
    realization = realize_preset(preset)
    assert (realization.form, realization.decomposition) == ("direct-2", "cascade")
    assert (realization.filter, realization.format) == (preset.filter, preset.format)
    plain = realize_preset(parse_preset(f"rate = 48000\n{PEAK}{text}".replace('scaling = "l2"\n', "")))
    assert realization.diagram != plain.diagram


def test_unstable_as_asked_is_told_at_the_filter():
    assert refused("\n[[filter]]\nb = [1.0]\na = [1.0, -2.0]\n").startswith(
        "preset:3: The filter as asked is unstable: 1 of its poles lies on or outside the unit circle."
    )
    assert "2 of its poles lie on" in refused("[[filter]]\nb = [1.0]\na = [1.0, -4.0, 4.0]\n")
    assert realize_preset(parse_preset(
        "rate = 48000\nallow_unstable = true\n[[filter]]\nb = [1.0]\na = [1.0, -2.0]\n")).unstable == 1


@pytest.mark.parametrize(("format", "said"), [
    ('signal = "Q1.15"\ncoefficients = "Q1.15"', 'preset:9: coefficients = "Q1.15": The coefficient b0 = '),
    ('coefficients = { word = "Q1.15", rounding = "floor" }\nsignal = "Q1.15"',
     'preset:8: coefficients = { word = "Q1.15", rounding = "floor" }: The coefficient b0 = '),
    ('signal = "Q1.15"\naccumulator = 24', "preset:9: accumulator = 24: An accumulator of 24 bits has no room"),
    ('arithmetic = "16x16+40"\naccumulator = 24', "preset:9: accumulator = 24: An accumulator of 24 bits has no room"),
])
def test_what_does_not_fit_is_told_at_its_key(format, said):
    assert refused(f"{PEAK}[format]\n{format}\n").startswith(said)


@pytest.mark.parametrize(("format", "said"), [
    ('signal = "Q1.15"', 'preset:6: signal = "Q1.15": The coefficient b1 = 1e-06 becomes 0 in Q1.15'),
    ('output = "Q1.15"\narithmetic = "16x16+40"',
     'preset:7: arithmetic = "16x16+40": The coefficient b1 = 1e-06 becomes 0 in Q1.15'),
])
def test_without_the_key_the_one_that_decides_is_named(format, said):
    assert refused(f"[[filter]]\nb = [0.5, 1e-6]\n\n[format]\n{format}\n").startswith(said)


BUTTERWORTH = '[[filter]]\nkind = "butterworth"\nresponse = "low-pass"\norder = 5\nfrequency = 1000.0\n'
CODES = '[[filter]]\nsections = { codes = [[4096, 0, 0, 4096, -2048, 0]], word = "Q4.12" }\n'


@pytest.mark.parametrize(("filter", "structure", "said"), [
    (CODES, 'form = "direct-1"\ndecomposition = "whole"',
     'preset:6: decomposition = "whole" changes the sections, and this filter'),
    (CODES, 'ordering = "inward"', 'preset:5: ordering = "inward" changes the sections of a filter'),
    (BUTTERWORTH, 'scaling = "none"\npairing = "given"',
     'preset:9: pairing = "given" keeps the sections that a filter is given as'),
    (BUTTERWORTH, 'ordering = "given"', 'preset:8: ordering = "given" keeps the order that sections were given in'),
])
def test_a_choice_that_cannot_carry_the_filter_is_told_at_its_key(filter, structure, said):
    assert refused(f"{filter}[structure]\n{structure}\n").startswith(said)


def test_codes_keep_their_word():
    said = refused(f'{CODES}[format]\nsignal = "Q1.15"\ncoefficients = "Q2.14"\n')
    assert said.startswith('preset:6: coefficients = "Q2.14": The filter is given as codes of Q4.12')


def test_a_choice_that_is_not_stated_is_told_at_its_table():
    order = 200
    text = f"[[filter]]\nb = [1.0]\na = [1.0{', 0.0' * (order - 1)}, 0.5]\n"
    assert refused(f"{text}[structure]\nform = \"direct-1\"\n").startswith("preset:5: dividing a filter needs its roots")


def test_what_was_varied_is_said():
    said = refused(f'{PEAK}[format]\nsignal = "Q1.15"\n', "format.coefficients=Q1.15", "filter.gain_db=12")
    assert said.startswith('preset:7: coefficients = "Q1.15": The coefficient b')
    assert said.endswith("(Varied: Q1.15, gain_db 12)")


def test_all_presets_are_told_together_and_alike_only_once():
    good = parse_preset(f"rate = 48000\n{PEAK}")
    narrow = parse_preset(f'rate = 48000\n{PEAK}[format]\nsignal = "Q1.15"\ncoefficients = "Q1.15"\n')
    away = parse_preset("rate = 48000\n[[filter]]\nb = [1.0]\na = [1.0, -2.0]\n")
    with pytest.raises(PresetError) as caught:
        realize_presets([narrow, good, away, narrow])
    assert [problem.split(":")[1] for problem in caught.value.problems] == ["9", "2"]
    assert [one.form for one in realize_presets([good, good])] == ["transposed-2"] * 2
