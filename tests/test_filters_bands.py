"""Octave bands and parts of them: edges, the mask of the standard, and what the filters make of it."""

from math import inf, pi, tan

import numpy as np
import pytest
from levels import decibels

from streamhost.filters import curve_fit, design
from streamhost.filters.curves.band_mask import band_goals, breakpoint_ratio
from streamhost.filters.curves.bands import OCTAVE_RATIO, OCTAVES, THIRD_OCTAVES, band_edges


# IEC 61260-1:2014, base-ten ratio, as quoted, recomputed for this project.
def test_band_ratios_and_edges():
    assert pytest.approx(1.995262315, abs=5e-10) == OCTAVE_RATIO
    assert band_edges(1000, 1) == pytest.approx((707.9458, 1412.5375), abs=5e-5)
    ratios = {1 / 8: 1.09018, 1 / 4: 1.1885, 3 / 8: 1.29569, 1 / 2: 1.41254, 1: 1.99526, 2: 3.98107, 3: 7.94328}
    for x, ratio in ratios.items():
        assert breakpoint_ratio(x, 1) == pytest.approx(ratio, abs=5.1e-6)
    # A third of an octave has its own edges at its own breakpoint.
    assert breakpoint_ratio(0.5, 3) == pytest.approx(10**0.05, rel=1e-14)


def test_the_mask_is_that_of_the_table():
    """IEC 61260-1:2014, Table 1, class 1, as quoted: attenuation at least and at most, at the breakpoints."""
    table = {0: (-0.4, 0.4), 1 / 8: (-0.4, 0.5), 1 / 4: (-0.4, 0.7), 3 / 8: (-0.4, 1.4), 1: (16.6, inf), 2: (40.5, inf),
             3: (60, inf), 4: (70, inf)}
    goals = band_goals(1000, 1, 4)
    for x, (least, most) in table.items():
        for hertz in (1000 * OCTAVE_RATIO**x, 1000 / OCTAVE_RATIO**x):
            (goal,) = (goal for goal in goals if goal.hertz == pytest.approx(hertz, rel=1e-12))
            assert (-goal.upper_db, -goal.lower_db) == pytest.approx((least, most), rel=1e-12)
    for edge in band_edges(1000, 1):
        inside_and_outside = [goal for goal in goals if goal.hertz == pytest.approx(edge, rel=1e-12)]
        limits = sorted((-goal.upper_db, -goal.lower_db) for goal in inside_and_outside)
        assert limits == [pytest.approx((-0.4, 5.3)), pytest.approx((1.2, inf))]


BANDS = [("octave-band", nominal) for nominal in OCTAVES] + [("third-octave-band", nominal) for nominal in THIRD_OCTAVES]


@pytest.mark.parametrize("rate", [48000, 96000])
@pytest.mark.parametrize(("kind", "nominal"), BANDS)
def test_every_band_keeps_class_1(kind, nominal, rate):
    fit = curve_fit(kind, rate, frequency=nominal)
    assert fit.met
    assert fit.order == 8
    f = design(kind, rate=rate, frequency=nominal)
    edges = band_edges(nominal, 1 if kind == "octave-band" else 3)
    assert decibels(f.response(edges)) == pytest.approx([-3.0103] * 2, abs=1e-4)  # four decimals of half the power


def test_order_3_fails_next_to_half_the_rate_and_says_where():
    failing = [
        (kind, nominal, min(row.goal.hertz for row in fit.failing))
        for kind, nominal in BANDS
        if not (fit := curve_fit(kind, 48000, frequency=nominal, order=3)).met
    ]
    assert [(kind, nominal) for kind, nominal, _ in failing] == [
        ("octave-band", 16000), ("third-octave-band", 12500), ("third-octave-band", 16000), ("third-octave-band", 20000),
    ]
    # The lower skirt, which the bilinear transform flattens.
    assert all(hertz < nominal / 2 for _, nominal, hertz in failing)


def test_below_half_the_rate_a_band_of_the_prewarped_transform_is_what_its_formula_says():
    """The bilinear transform of an analogue Butterworth band: its attenuation at a frequency in closed form."""
    f = design("octave-band", rate=48000, frequency=4000)
    low, high = (tan(pi * edge / 48000) for edge in band_edges(4000, 1))
    hertz = np.geomspace(1000, 16000, 31)
    w = np.tan(pi * hertz / 48000)
    wanted = -10 * np.log10(1 + ((w - low * high / w) / (high - low)) ** 8)
    # Poles 0.1 from the circle, of order 8.
    assert decibels(f.response(hertz)) == pytest.approx(wanted, abs=1e-9)
