"""Several outputs, and channels with coefficients of their own, in one diagram: what is drawn, and what it computes."""

import numpy as np
import pytest
from native_runs import busy, run_native

import streamhost as sh
from streamhost.diagram.norms import response_to_output
from streamhost.errors import FilterError, FormatError, RequestError, StructureError
from streamhost.formats import Fixed, Float
from streamhost.program.native.kernel import Variant
from streamhost.program.run import run_definition

RATE = 48000
DIRECT = ("direct-1", "direct-1-swapped", "direct-2", "transposed-1", "transposed-2")
"""The forms that draw any numerator and denominator as they are written."""

PEAK = sh.design("peak", rate=RATE, frequency=300, gain_db=6, q=1)
SHELF = sh.design("high-shelf", rate=RATE, frequency=5000, gain_db=-4, q=0.7)
TWO_WAY = sh.design("linkwitz-riley", rate=RATE, order=4, frequency=2000)
THREE_WAY = sh.design("linkwitz-riley-3", rate=RATE, frequency=[400, 4000])
WORDS = Fixed("Q1.15", coefficients="Q3.13", accumulator=40)


def hertz():
    return np.geomspace(10.0, 23999.0, 97)


def responses(realization, channel=0):
    """From the diagram's own state space, (outputs, frequencies)."""
    w, diagram = 2 * np.pi * hertz() / RATE, realization.diagram
    outputs = range(len(diagram.outputs))
    return np.array([response_to_output(diagram, diagram.inputs, w, channel, output=k)[:, 0] for k in outputs])


# What is drawn


@pytest.mark.parametrize("scaling", ["none", "l2"])
@pytest.mark.parametrize("form", DIRECT)
@pytest.mark.parametrize("decomposition", ["cascade", "whole"])
def test_every_form_makes_every_output_as_asked(form, decomposition, scaling):
    filter = sh.Filter.cascade([PEAK, SHELF, TWO_WAY])
    made = sh.realize(filter, form=form, decomposition=decomposition, scaling=scaling)
    assert made.outputs == ("low", "high")
    # five sections in float64 with poles no nearer to the circle than 0.02
    assert responses(made) == pytest.approx(filter.response(hertz()), abs=1e-9)


def test_labels_carry_the_name_of_the_output():
    made = sh.realize(sh.Filter.cascade([PEAK, TWO_WAY]), form="direct-2", scaling="l2")
    labels = {node.label for node in made.diagram.nodes}
    assert {"y", "b0", "g", "between_1", "y_low_1", "b0_low_1", "g_low", "between_low_1", "y_low_2", "y_high_1", "g_high",
            "low", "high"} <= labels
    assert {slot.section for slot in made.diagram.slots} == {0, 1, 2, 3, 4}
    single = sh.realize(sh.design("linkwitz-riley", rate=RATE, order=2, frequency=2000), form="direct-1")
    assert {"y_low", "b0_low", "a2_high"} <= {node.label for node in single.diagram.nodes}


@pytest.mark.parametrize("form", ["direct-1", "transposed-2"])
def test_what_is_common_is_there_once_and_outputs_share_no_delay(form):
    """Counts of a second-order section: 5 multiplications, 4 additions; 4 delays in direct-1, 2 in transposed-2."""
    delays = {"direct-1": 4, "transposed-2": 2}[form]
    counts = sh.realize(sh.Filter.cascade([PEAK, SHELF, TWO_WAY]), form=form).diagram.counts()
    assert (counts.multiplications, counts.additions, counts.delays) == (6 * 5, 6 * 4, 6 * delays)
    counts = sh.realize(THREE_WAY, form=form).diagram.counts()
    assert (counts.multiplications, counts.additions, counts.delays) == (11 * 5, 11 * 4, 11 * delays)


def test_outputs_read_one_register_behind_what_is_common():
    made = sh.realize(sh.Filter.cascade([PEAK, TWO_WAY]), form="direct-1", format=WORDS)
    nodes, readers = made.diagram.nodes, made.diagram.readers
    fork = next(index for index, node in enumerate(nodes) if node.label == "between_1")
    assert {nodes[reader].label for reader in readers[fork]} == {"b0_low_1", "b0_high_1", "x1_low_1", "x1_high_1"}
    # direct-1 has one rounding a section; the register holds what the section's own has rounded already
    assert len(made.program.roundings) == 5


def test_without_a_common_part_every_output_reads_the_input():
    made = sh.realize(TWO_WAY, form="direct-1")
    assert {made.diagram.nodes[reader].label for reader in made.diagram.readers[0]} == {
        "b0_low_1", "b0_high_1", "x1_low_1", "x1_high_1"}


def test_an_equation_for_each_output():
    made = sh.realize(sh.design("butterworth-crossover", rate=RATE, order=1, frequency=12000), form="direct-1")
    # tan(pi / 4) is 1: (1 + z^-1) / 2 and (1 - z^-1) / 2
    assert made.diagram.equation(digits=6).splitlines() == [
        "low[n] = 0.5 x[n] + 0.5 x[n-1]", "# not recursive", "high[n] = 0.5 x[n] - 0.5 x[n-1]", "# not recursive"]


def test_each_part_is_divided_and_scaled_as_if_it_stood_alone():
    made = sh.realize(sh.Filter.cascade([PEAK, TWO_WAY]), form="direct-2", scaling="l2").built
    alone = [sh.realize(part, form="direct-2", scaling="l2").built for part in
             (PEAK, TWO_WAY.branches[0].filter, TWO_WAY.branches[1].filter)]
    assert [part.name for part in made.channels[0]] == ["", "low", "high"]
    assert [part.division.sections for part in made.channels[0]] == [one.sections for one in alone]
    assert [part.division.front for part in made.channels[0]] == [one.front for one in alone]


def test_a_refusal_names_the_output():
    with pytest.raises(StructureError, match='pairing "given" keeps the sections'):
        sh.realize(TWO_WAY, pairing="given")


def test_hazards_of_every_output_are_said():
    steep = sh.design("linkwitz-riley", rate=RATE, order=8, frequency=50)
    assert "a recursion of order 8 is drawn undivided" in sh.realize(steep, decomposition="whole").built.hazards[0]


# What it computes

FORMATS = {"words": WORDS, "float32": Float("float32")}
SMALL = {
    "dithered": Fixed("Q1.15", coefficients="Q3.13", dither="tpdf", dither_seed=4),
    "float32": Float("float32"),
}


def defined(filter, x, form, format):
    """(frames, outputs, channels) by the definition."""
    return run_definition(sh.realize(filter, form=form, format=format).program, x)


@pytest.mark.parametrize("format", SMALL)
def test_kernel_and_definition_agree_at_every_output_of_every_channel(format):
    """Sections of first order, so that the kernels compile quickly; each channel has its own number of them."""
    first, second = (sh.design("butterworth-crossover", rate=RATE, order=order, frequency=3000) for order in (1, 2))
    filters = (sh.Filter.cascade([sh.design("dc-blocker", rate=RATE, frequency=100), first]), second)
    program = sh.realize(filters, form="transposed-2", format=SMALL[format]).program
    x = busy(200, 2, 5)
    metered = run_native(program, x, Variant(metered=True))
    assert metered.y.shape == (200, 2, 2)
    np.testing.assert_array_equal(run_native(program, x).y, metered.y)
    np.testing.assert_array_equal(metered.y, run_definition(program, x))
    assert (np.abs(metered.y).max(axis=0) > 0.01).all()
    # not one of the four is another
    assert len({metered.y[:, k, c].tobytes() for k in (0, 1) for c in (0, 1)}) == 4


@pytest.mark.parametrize("format", FORMATS)
def test_an_output_is_the_same_sections_alone(format):
    """To the bit: what is common, then what leads to the output. With dither it were not so: noise goes by the place."""
    x = np.random.default_rng(3).uniform(-0.5, 0.5, (60, 1))
    y = defined(sh.Filter.cascade([PEAK, TWO_WAY]), x, "direct-1", FORMATS[format])
    first = defined(PEAK, x, "direct-1", FORMATS[format])
    for k, branch in enumerate(TWO_WAY.branches):
        np.testing.assert_array_equal(y[:, k : k + 1], defined(branch.filter, first[:, 0], "direct-1", FORMATS[format]))


# Channels that differ


@pytest.mark.parametrize("format", FORMATS)
@pytest.mark.parametrize("form", DIRECT)
def test_channels_are_those_of_filters_of_their_own(form, format):
    """A wire multiplies by 1 and adds zeros, and a register passes on what is already rounded: not a bit differs."""
    filters = (sh.Filter.cascade([PEAK, SHELF]), sh.design("low-pass", rate=RATE, frequency=4000, q=0.9),
               sh.design("butterworth", rate=RATE, response="high-pass", order=3, frequency=100))
    x = np.random.default_rng(7).uniform(-0.7, 0.7, (60, 3))
    y = defined(filters, x, form, FORMATS[format])
    for channel, filter in enumerate(filters):
        np.testing.assert_array_equal(y[:, :, channel], defined(filter, x[:, [channel]], form, FORMATS[format])[:, :, 0])


@pytest.mark.parametrize("scaling", ["none", "l2"])
@pytest.mark.parametrize("decomposition", ["cascade", "whole"])
@pytest.mark.parametrize("form", DIRECT)
def test_each_channel_has_the_response_that_is_asked_of_it(form, decomposition, scaling):
    filters = (sh.Filter.cascade([PEAK, TWO_WAY]), sh.design("butterworth-crossover", rate=RATE, order=3, frequency=500))
    made = sh.realize(filters, form=form, decomposition=decomposition, scaling=scaling)
    assert made.filters == filters and made.rate == RATE
    assert made.diagram.channels == 2
    for channel, filter in enumerate(filters):
        assert responses(made, channel) == pytest.approx(filter.response(hertz()), abs=1e-9)


def test_in_parallel_too_a_part_that_a_channel_lacks_lets_pass():
    first, second = (sh.design("butterworth-crossover", rate=RATE, order=order, frequency=2000) for order in (3, 4))
    filters = (sh.Filter.cascade([PEAK, SHELF, first]), second)
    made = sh.realize(filters, form="direct-1", decomposition="parallel")
    for channel, filter in enumerate(filters):
        assert responses(made, channel) == pytest.approx(filter.response(hertz()), abs=1e-9)


def test_one_graph_runs_all_channels():
    filters = (PEAK, sh.Filter.cascade([PEAK, SHELF]))
    made = sh.realize(filters, form="direct-1")
    assert made.diagram.hash == sh.realize(filters[1], form="direct-1").diagram.hash
    rows = dict(zip((slot.label for slot in made.diagram.slots), made.diagram.values.tolist(), strict=True))
    assert [rows[label][0] for label in ("b0_2", "b1_2", "b2_2", "a1_2", "a2_2")] == [1.0, 0.0, 0.0, 0.0, 0.0]
    assert all(row[0] == row[1] for label, row in rows.items() if label.endswith("_1"))


def test_one_channel_of_coefficients_runs_on_any_number_of_channels_and_two_on_two():
    assert sh.realize((PEAK,)).process(np.zeros((5, 3))).shape == (5, 3)
    with pytest.raises(RequestError, match="coefficients for 2 channels, and 3 came"):
        sh.realize((PEAK, SHELF)).process(np.zeros((5, 3)))


def test_the_worst_channel_decides_whether_it_is_unstable():
    low = sh.design("high-pass", rate=RATE, frequency=28, q=0.707)
    # Own computation on the cookbook formulas: at 20 to 50 Hz two poles of 16-bit coefficients come to lie on z = 1 or near it
    assert sh.realize((PEAK, low), form="direct-1", format=Fixed("Q1.15", coefficients="Q2.14")).unstable == 1
    unstable = sh.Filter.from_coefficients([1.0], [1.0, -1.5], rate=RATE)
    with pytest.raises(FilterError, match="unstable: 1 of its poles"):
        sh.realize((PEAK, unstable))
    assert sh.realize((PEAK, unstable), allow_unstable=True).unstable_as_asked


CHANNELS = {
    "different rates": lambda: (PEAK, sh.design("peak", rate=44100, frequency=300, gain_db=6, q=1)),
    "different outputs": lambda: (PEAK, TWO_WAY),
    "realize takes a Filter, not tuple": lambda: (),
    "codes of another word": lambda: (sh.Filter.from_codes([[1, 0, 0, 0, 0]], "Q2.14", rate=RATE), PEAK),
}


@pytest.mark.parametrize("reason", CHANNELS)
def test_channels_that_do_not_go_together(reason):
    with pytest.raises(FilterError, match=reason):
        sh.realize(CHANNELS[reason](), format=WORDS)


def test_codes_of_all_channels_keep_their_word():
    codes = [sh.Filter.from_codes([[code, 0, 0, -100, 0]], "Q2.14", rate=RATE) for code in (16384, 9000)]
    made = sh.realize(codes, form="direct-1", format="16x16+40")
    (place,) = (k for k, slot in enumerate(made.diagram.slots) if slot.label == "b0")
    assert made.program.stored.codes[place] == (16384, 9000)
    with pytest.raises(FormatError, match="leave `coefficients` out"):
        sh.realize(codes, form="direct-1", format=WORDS)
