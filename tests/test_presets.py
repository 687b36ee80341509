"""What a preset states, and what is said of one that states it wrongly."""

from pathlib import Path

import pytest

from streamhost.errors import PresetError
from streamhost.filters import Filter, design
from streamhost.formats import FLOATS, Fixed, Float
from streamhost.presets import Preset, load_preset, parse_preset
from streamhost.presets.bands import Band
from streamhost.presets.tables import LimitsTable
from streamhost.structures import forms

HEAD = "rate = 48000\n"
PEAK = '[[filter]]\nkind = "peak"\nfrequency = 1000\ngain_db = 6.0\nq = 0.707\n'
GOOD = HEAD + PEAK

WHOLE = """title = "Peak in double-length state"
rate = 48000
allow_unstable = true
[[filter]]
kind = "peak"
frequency = 1000
gain_db = 6.0
q = 0.707
[structure]
decomposition = "whole"
form = "direct-1"
pairing = "given"
ordering = "inward"
scaling = "l2"
[format]
signal = "Q1.15"
coefficients = "Q2.30"
state = { word = "Q1.31", rounding = "floor" }
operand = "Q1.31"
[limits]
noise_dbfs = -92
response_deviation_db = 0.1
band_hz = [20, 20000]
"""


def problems(text):
    with pytest.raises(PresetError) as caught:
        parse_preset(text, Path("mine.toml"))
    assert str(caught.value) == "\n".join(caught.value.problems)
    return list(caught.value.problems)


def problem(text):
    found = problems(text)
    assert len(found) == 1, found
    return found[0]


# What is right


def test_everything_that_a_preset_can_state():
    preset = parse_preset(WHOLE, Path("folder/mine.toml"))
    assert preset == Preset(
        title="Peak in double-length state", path=Path("folder/mine.toml"), rate=48000.0,
        designs={48000.0: (Band(design("peak", rate=48000, frequency=1000, gain_db=6, q=0.707)),)},
        form="direct-1", decomposition="whole", pairing="given", ordering="inward", scaling="l2", outputs=None,
        format=Fixed("Q1.15", coefficients="Q2.30", state={"word": "Q1.31", "rounding": "floor"}, operand="Q1.31"),
        limits={"noise_dbfs": -92.0, "response_deviation_db": 0.1, "band_hz": (20.0, 20000.0)},
        allow_unstable=True, source=preset.source,
    )


def test_what_is_left_out_has_the_defaults_of_a_realization():
    preset = parse_preset(GOOD, Path("folder/mine.toml"))
    assert preset.title == "mine"
    assert (preset.form, preset.decomposition) == ("transposed-2", "cascade")
    assert (preset.pairing, preset.ordering, preset.scaling) == (None, None, None)
    assert preset.format == Float("float64")
    assert preset.limits == {}
    assert preset.allow_unstable is False


def test_several_filters_stand_in_cascade():
    peak = design("peak", rate=48000, frequency=1000, gain_db=6, q=0.707)
    difference = Filter.from_coefficients([1.0, -1.0], rate=48000)
    assert parse_preset(GOOD + "[[filter]]\nb = [1, -1]\n").filter == Filter.cascade([peak, difference])


@pytest.mark.parametrize(
    ("table", "expected"),
    [
        ("b = [0.5, 0.5]\na = [1, -0.9]", Filter.from_coefficients([0.5, 0.5], [1, -0.9], rate=48000)),
        ("sections = [[1, 2, 1, 1, 0, 0.5], [1, 0, 0, 2, 1, 0]]",
         Filter.from_sections([[1, 2, 1, 1, 0, 0.5], [1, 0, 0, 2, 1, 0]], rate=48000)),
        ('sections = { codes = [[4096, -8192, 4096, 4096, -8000, 3910]], word = "Q4.12" }',
         Filter.from_codes([[4096, -8192, 4096, 4096, -8000, 3910]], "Q4.12", rate=48000)),
        ("zeros = [-1.0, 0.25]\npoles = [[0.5, 0.2], [0.5, -0.2]]\nfactor = 2",
         Filter.from_zeros_poles([-1, 0.25], [0.5 + 0.2j, 0.5 - 0.2j], 2, rate=48000)),
    ],
)
def test_the_ways_to_state_a_filter(table, expected):
    assert parse_preset(f"{HEAD}[[filter]]\n{table}\n").filter == expected


@pytest.mark.parametrize(
    ("table", "expected"),
    [
        ("", FLOATS["float64"]),
        ('arithmetic = "float32"', Float("float32")),
        ('arithmetic = "float32-fused"', Float("float32", fused=True)),
        ('arithmetic = "float32"\naccumulator = "float64"\nflush_subnormals = true',
         Float("float32", accumulator="float64", flush_subnormals=True)),
        ('arithmetic = "24x24+56"\noutput = "Q1.15"', Fixed(arithmetic="24x24+56", output="Q1.15")),
        ('signal = "Q1.15"\naccumulator = 40\nproduct = 20\nrounding = "floor"\ndither = "tpdf"\ndither_seed = 7',
         Fixed("Q1.15", accumulator=40, product=20, rounding="floor", dither="tpdf", dither_seed=7)),
    ],
)
def test_formats(table, expected):
    assert parse_preset(f"{GOOD}[format]\n{table}\n").format == expected


def test_a_byte_order_mark_and_foreign_line_ends_do_no_harm(tmp_path):
    file = tmp_path / "mine.toml"
    file.write_bytes(b"\xef\xbb\xbf" + WHOLE.replace("\n", "\r\n").encode())
    assert load_preset(file) == parse_preset(WHOLE, file)


# What is wrong: all of it at once, each at its line

MANY = """title = 3
rate = 48000
rat = 5
allow_unstable = "yes"
[[filter]]
kind = "high-pass"
frequency = 30000
q = "high"
gain = 1
[[filter]]
kind = "higpass"
[[filter]]
b = [
  1.0,
  nan ]
[[filter]]
b = [1.0]
a = [0.0, 1.0]
[structure]
form = "direct1"
decompositon = "whole"
[format]
arithmetic = "16x16"
signal = "Q40.40"
state.word = "Q1.99"
state.rounding = "up"
fused = true
rounding = "hlaf-up"
[limits]
band_hz = [200, 20]
noise = 3
noise_dbfs = inf
response_deviation_db = -1
"""


def test_all_mistakes_of_a_file_are_told_at_once_in_its_order():
    found = problems(MANY)
    assert [text.partition(" ")[0] for text in found] == [
        f"mine.toml:{line}:"
        for line in (1, 3, 4, 7, 8, 9, 11, 15, 18, 20, 21, 23, 24, 25, 26, 27, 28, 30, 31, 32, 33)
    ]
    assert found[0] == "mine.toml:1: title = 3 is not allowed: title is a text in quotes."
    assert found[3] == (
        "mine.toml:7: frequency = 30000 is not allowed: a number above 0 and below half the rate (24000)."
    )
    *before, last = forms()
    known = f"{', '.join(before)} or {last}"
    assert found[9].endswith(f'form = "direct1" is not known: {known}. Did you mean "direct-1"?')
    assert all("\n" not in text for text in found)


def test_mending_one_mistake_after_the_other_leads_to_a_preset():
    lines = MANY.splitlines()
    for line, mended in {
        1: "", 3: "", 4: "", 7: "frequency = 30", 8: "", 9: "", 11: 'kind = "low-pass"\nfrequency = 9000', 15: "2]",
        18: "a = [1.0]", 20: 'form = "direct-1"', 21: "", 23: 'arithmetic = "16x16+40"', 24: "", 25: "", 26: "",
        27: "", 28: "", 30: "", 31: "", 32: "", 33: "",
    }.items():
        before = len(problems("\n".join(lines)))
        lines[line - 1] = mended
        if line < 33:
            assert len(problems("\n".join(lines))) == before - 1
    assert parse_preset("\n".join(lines)).format == Fixed(arithmetic="16x16+40")


FILTERS = {
    'kind = "high-pass"\nfrequency = 24000\n':
        "mine.toml:4: frequency = 24000 is not allowed: a number above 0 and below half the rate (24000).",
    'kind = "high-pass"\nfrequency = nan\n':
        "mine.toml:4: frequency = nan is not allowed: a number above 0 and below half the rate (24000).",
    'kind = "high-pass"\n':
        'mine.toml:2: frequency is missing: "high-pass" needs it, a number above 0 and below half the rate (24000).',
    'kind = "high-pass"\nfrequency = 28\nquality = 1\n':
        'mine.toml:5: quality is no parameter of "high-pass", which takes frequency or q.',
    'kind = "high-pass"\nfrequency = 28\n"q\\n\\u001b" = 1\n':
        'mine.toml:5: q\\n\\x1b is no parameter of "high-pass", which takes frequency or q.',
    'kind = "low-shelf"\nfrequency = 28\ngain_db = 3\nslop = 1\nq = 1\n':
        'mine.toml:6: slop is no parameter of "low-shelf", which takes frequency, gain_db, q or slope. '
        'Did you mean "slope"?',
    'kind = "peak"\nfrequency = 28\ngain_db = 3\n':
        'mine.toml:2: "peak" needs exactly one of q and bandwidth, and neither is given.',
    'kind = "peak"\nfrequency = 28\ngain_db = 3\nq = 1\nbandwidth = 1\n':
        'mine.toml:2: "peak" needs exactly one of q and bandwidth, and both are given.',
    "kind = 5\n": "mine.toml:3: kind = 5 is not allowed: kind is a text in quotes.",
    "b = []\n": "mine.toml:3: b is empty; at least one number is needed.",
    "b = [1]\na = []\n": "mine.toml:4: a is empty; at least one number is needed.",
    "b = [1]\na = [0, 1]\n": "mine.toml:4: a[0] is 0; the first of the 2 numbers in a must not be 0.",
    "b = [1, true]\n": "mine.toml:3: b[1] = true is not allowed: b is a list of numbers, for instance [1.0, -0.5].",
    "b = 1\n": "mine.toml:3: b = 1 is not allowed: b is a list of numbers, for instance [1.0, -0.5].",
    "b = [\n 1,\n -inf]\n": "mine.toml:5: b[1] = -inf is not a finite number.",
    "a = [1]\n": "mine.toml:2: b is missing: a list of numbers, for instance [1.0, -0.5].",
    "b = [1]\nc = [1]\n": "mine.toml:4: c is no key of this [[filter]], which takes b or a.",
    "sections = []\n": "mine.toml:3: sections is empty; at least one row b0 b1 b2 a0 a1 a2 is needed.",
    "sections = [[1, 0, 0, 1, 0, 0],\n[1, 0, 0]]\n":
        "mine.toml:4: sections[1] has 3 numbers; a section is six: b0 b1 b2 a0 a1 a2.",
    "sections = [\n[1, 0, 0, 0, 0, 0]]\n":
        "mine.toml:4: a0 of sections[0] is 0; the fourth number of a section must not be 0.",
    'sections = { codes = [[1, 0, 0, 5, 0, 0]], word = "Q4.12" }\n':
        "mine.toml:3: codes[0][3] is a0 = 5; in Q4.12 a0 must be the code of 1, which is 4096.",
    'sections = { codes = [[1, 0, 0.5, 0, 0]], word = "Q4.12" }\n':
        "mine.toml:3: sections.codes[0][2] = 0.5 is not allowed: "
        "codes is a list of rows of whole numbers, b0 b1 b2 a0 a1 a2.",
    "sections = { codes = [[1, 0, 0, 0, 0]] }\n": "mine.toml:3: word is missing: a text in quotes.",
    "zeros = []\npoles = [[0.5, 0.5]]\nfactor = 1\n":
        "mine.toml:4: poles[0] is (0.5+0.5j) and its conjugate (0.5-0.5j) is not among them as often; "
        "complex roots come in exactly conjugate pairs.",
    "zeros = [[1]]\npoles = [1]\nfactor = 1\n":
        "mine.toml:3: zeros[0] = [1] is not allowed: "
        "zeros is a list, of at most 1000, of real numbers and pairs [real, imaginary].",
    "zeros = [1]\npoles = [1]\n": "mine.toml:2: factor is missing: a number.",
    'kind = "peak"\nb = [1]\n':
        "mine.toml:2: this [[filter]] states 2 filters, by kind and by b and a: "
        "one [[filter]] table for each, and they stand in cascade.",
    "": "mine.toml:2: this [[filter]] states no filter: by kind, equation, b and a, sections or "
        "zeros, poles and factor.",
    'equation = "y[n] = z[n]"\n':
        'mine.toml:3: equation, column 8: "z" is not known; the signals are x and y, each with a time, as in x[n-1].',
    'equation = """\ny[n] = x[n]\n  + y[n+1]"""\n':
        "mine.toml:3: equation, line 2, column 5: y[n+1] lies in the future, which a filter does not know; a time is n, "
        "n-1, n-2 and so on.",
    "equation = 1\n": "mine.toml:3: equation = 1 is not allowed: equation is a text in quotes.",
}


@pytest.mark.parametrize(("table", "expected"), FILTERS.items(), ids=range(len(FILTERS)))
def test_filters_that_cannot_be(table, expected):
    assert problem(f"{HEAD}[[filter]]\n{table}") == expected


def test_a_filter_whose_key_is_misspelt_is_told_the_nearest():
    assert problems(f'{HEAD}[[filter]]\n"kind\\n" = "peak"\n')[1] == (
        'mine.toml:3: kind\\n is not known. Did you mean "kind"?'
    )


HEADS = {
    "rate = 48000\n":
        "mine.toml: filter is missing: one or more tables, each headed [[filter]] in two pairs of brackets.",
    "rate = 48000\nfilter = []\n":
        "mine.toml:2: filter = [] states no filter: at least one table [[filter]] is needed.",
    "rate = 48000\n[filter]\nb = [1]\n":
        "mine.toml:2: filter = { b = [1] } is not allowed: filter is one or more tables, each headed [[filter]] in two "
        "pairs of brackets.",
    "rate = 48000\nfilter = [1]\n":
        "mine.toml:2: filter[0] = 1 is not allowed: filter is one or more tables, each headed [[filter]] in two "
        "pairs of brackets.",
    "[[filter]]\nb = [1]\n": "mine.toml: rate is missing: a number of hertz.",
    "rate = 0\n[[filter]]\nb = [1]\n":
        "mine.toml:1: rate = 0.0 is not allowed: a sample rate is a number of hertz above 0.",
    "rate = nan\n[[filter]]\nb = [1]\n": "mine.toml:1: rate = nan is not a finite number.",
    'rate = "48 kHz"\n[[filter]]\nb = [1]\n':
        'mine.toml:1: rate = "48 kHz" is not allowed: rate is a number of hertz.',
    "rate = 0x" + "f" * 300 + "\n[[filter]]\nb = [1]\n":
        "mine.toml:1: rate = a whole number of 1200 bits is not allowed: rate is a number of hertz.",
    "rate = 48000\nformat = 1\n[[filter]]\nb = [1]\n": "mine.toml:2: format = 1 is not allowed: format is a table.",
    "rate = 48000\ninclude = \"other.toml\"\n[[filter]]\nb = [1]\n":
        "mine.toml:2: include is no key of the head of a preset, which takes rate, rates, filter, title, allow_unstable, "
        "structure, format or limits.",
    'title = "a\\u001b[31mb"\nrate = 48000\n[[filter]]\nb = [1]\n':
        'mine.toml:1: title = "a\\u001b[31mb" is not allowed: a title is one line of printable text.',
    "rate = 48000\n[[filter]]\nb = [1]\n[[filter]]\nsections = { codes = [[1, 0, 0, 0, 0]], word = \"Q4.12\" }\n":
        "mine.toml:2: a cascade joins a filter given as codes (Q4.12) with one that is given otherwise; "
        "codes stand only beside codes of the same word. Give all as codes, or all as numbers.",
}


@pytest.mark.parametrize(("text", "expected"), HEADS.items(), ids=range(len(HEADS)))
def test_heads_that_cannot_be(text, expected):
    assert problem(text) == expected


FORMATS = {
    'arithmetic = "float23"':
        '8: arithmetic = "float23" is not known: 16x16+40, 16x16-32, 32x16-high, 32x32-high, 24x24+56, 48x24+56, '
        '32x32+64, float32, float32-fused or float64. Did you mean "float32"?',
    'signal = "Q40.40"': '8: signal = "Q40.40" has 80 bits. A word here has from 2 to 64 bits.',
    'signal = "Q0.16"': '8: signal = "Q0.16" has no sign bit: m is at least 1, for instance "Q1.16".',
    "signal = 16":
        '8: signal = 16 is not allowed: signal is a word, for instance "Q1.15", or a table '
        '{ word = "Q1.15", rounding = "floor" }.',
    'signal = "Q1.15"\nstate = { wrd = "Q1.31" }':
        "9: state has no key 'wrd': word, rounding, overflow, dither. Did you mean \"word\"?",
    'signal = "Q1.15"\naccumulator = 4': "9: accumulator = 4 is not a whole number from 8 to 64.",
    'signal = "Q1.15"\naccumulater = 40':
        "9: accumulater is no key of [format], which takes arithmetic, signal, input, coefficients, operand, product, "
        "accumulator, state, output, rounding, rounding_place, overflow, feedback, pre_sum, dither, dither_seed, "
        'allow_vanishing or allow_clamping. Did you mean "accumulator"?',
    'signal = "Q1.15"\nfused = true':
        "9: fused = true belongs to floating point, which stands at all eight places of a format at once: "
        'state arithmetic = "float32" and no word, or leave it out.',
    'signal = "Q1.15"\naccumulator = "float64"':
        '9: accumulator = "float64" belongs to floating point, which stands at all eight places of a format at once: '
        'state arithmetic = "float32" and no word, or leave it out.',
    'arithmetic = "float32"\nsignal = "Q1.15"':
        '9: signal = "Q1.15" belongs to fixed point, and float32 stands at all eight places of a format at once: '
        "leave one of the two out.",
    'arithmetic = "float64"\naccumulator = "float32"':
        '9: accumulator = \'float32\' cannot stand over float64: it is left out, "float64" or "float64".',
    'arithmetic = "float32"\naccumulator = 40':
        '9: accumulator = 40 is not allowed: accumulator is "float64", over float32.',
    'signal = "Q1.15"\nrounding_place = "product"\nproduct = 12':
        '10: product and rounding_place = "product" say two things about one rounding: state one of them.',
}


@pytest.mark.parametrize(("table", "expected"), FORMATS.items(), ids=range(len(FORMATS)))
def test_formats_that_cannot_be(table, expected):
    assert problem(f"{GOOD}[format]\n{table}\n") == f"mine.toml:{expected}"


LIMIT_KEYS = LimitsTable.__struct_fields__
LIMITS = {
    "band_hz = [20]":
        "8: band_hz = [20.0] is not allowed: two numbers of hertz that rise, from 0 to half the rate (24000).",
    "band_hz = [20, 24001]":
        "8: band_hz = [20.0, 24001.0] is not allowed: two numbers of hertz that rise, from 0 to half the rate (24000).",
    "band_hz = 20": "8: band_hz = 20 is not allowed: band_hz is a list of numbers, for instance [1.0, -0.5].",
    "noise = -90":
        f"8: noise is no key of [limits], which takes {', '.join(LIMIT_KEYS[:-1])} or {LIMIT_KEYS[-1]}. "
        'Did you mean "noise_dbfs"?',
    'noise_dbfs = "-90"': '8: noise_dbfs = "-90" is not allowed: noise_dbfs is a number.',
    "response_deviation_db = -0.1":
        "8: response_deviation_db = -0.1 is not allowed: a deviation is at least 0 dB.",
    'changeover = "crossfade"':
        '8: changeover = "crossfade" is not known: keep, cold, carry, warm, fade or ramp. Did you mean "fade"?',
    "changeover_ms = 0": "8: changeover_ms = 0.0 is not allowed: a fade or ramp takes above 0 and at most 1000 ms.",
}


@pytest.mark.parametrize(("table", "expected"), LIMITS.items(), ids=range(len(LIMITS)))
def test_limits_that_cannot_be(table, expected):
    assert problem(f"{GOOD}[limits]\n{table}\n") == f"mine.toml:{expected}"
