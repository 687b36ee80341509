"""Designs by name: the formulas' published values, the classical families, and how mistakes are told."""

from fractions import Fraction
from math import log10, sqrt

import numpy as np
import pytest
from levels import decibels

from streamhost.errors import FilterError
from streamhost.filters import Filter, Polynomials, design, kinds
from streamhost.filters.classic import on_circle
from streamhost.filters.designs import KINDS

FLAT = 1 / sqrt(2)
INF = float("inf")


# W3C Audio EQ Cookbook (2021), formulas as quoted; coefficients computed for this project, divided by a0.
COOKBOOK = [  # kind, parameters, (b0 b1 b2 a1 a2), dB at 0 Hz, at the frequency, at 24 kHz
    (
        "low-pass",
        {"frequency": 1000, "q": FLAT},
        (0.003916126660547383, 0.007832253321094766, 0.003916126660547383, -1.815341082704568, 0.8310055893467576),
        (0.0, -3.0103, -INF),
    ),
    (
        "high-pass",
        {"frequency": 1000, "q": FLAT},
        (0.9115866680128315, -1.823173336025663, 0.9115866680128315, -1.815341082704568, 0.8310055893467576),
        (-INF, -3.0103, 0.0),
    ),
    (
        "band-pass",
        {"frequency": 1000, "q": 1},
        (0.0612647676882304, 0.0, -0.0612647676882304, -1.8614084445321082, 0.8774704646235392),
        (-INF, 0.0, -INF),
    ),
    (
        "peak",
        {"frequency": 1000, "q": FLAT, "gain_db": 6},
        (1.0610424252634374, -1.8612731439964758, 0.816291571321481, -1.8612731439964758, 0.8773339965849185),
        (0.0, 6.0, 0.0),
    ),
    (
        "peak",
        {"frequency": 1000, "q": 0.707, "gain_db": 6},
        (1.0610510792184844, -1.8612559024730442, 0.8162655270665764, -1.8612559024730442, 0.8773166062850608),
        (0.0, 6.0, 0.0),
    ),
    (
        "low-shelf",
        {"frequency": 100, "slope": 1, "gain_db": 6},
        (1.0032178957372329, -1.984364430776898, 0.9813866987491315, -1.9844243291390486, 0.9845446961242141),
        (6.0, 3.0, 0.0),
    ),
]


@pytest.mark.parametrize(("kind", "parameters", "coefficients", "response_db"), COOKBOOK)
def test_cookbook_sections(kind, parameters, coefficients, response_db):
    f = design(kind, rate=48000, **parameters)
    (section,) = f.sections()
    # The table's own demand; the same formulas on another C library may differ in the last place.
    assert section.b + section.a[1:] == pytest.approx(coefficients, rel=1e-14)
    found = decibels(f.response([0.0, parameters["frequency"], 24000.0]))
    # -3.0103 has four decimals; coefficients rounded to 2^-53 leave 1e-10 of a response near 0 Hz.
    assert found == pytest.approx(response_db, abs=5e-5)


def test_notch_and_all_pass():
    notch = design("notch", rate=48000, frequency=1000, q=2)
    assert decibels(notch.response([0.0, 24000.0])) == pytest.approx([0, 0], abs=1e-9)
    assert abs(notch.response(1000.0)) < 1e-12
    turning = design("all-pass", rate=48000, frequency=1000, q=2)
    (section,) = turning.sections()
    assert section.b == section.a[::-1]
    assert turning.response(1000.0) == pytest.approx(-1, abs=1e-12)


def test_a_high_shelf_is_the_low_shelf_turned_over():
    """By the formulas, gain and frequency scale: H_high(gain) = A^2 H_low(-gain), A^2 the gain as a factor."""
    high = design("high-shelf", rate=48000, frequency=3000, q=0.8, gain_db=9)
    low = design("low-shelf", rate=48000, frequency=3000, q=0.8, gain_db=-9)
    hertz = np.linspace(0, 24000, 49)
    # Some ten roundings of each coefficient, of a response that is 1 to 3.
    assert high.response(hertz) == pytest.approx(10 ** (9 / 20) * low.response(hertz), rel=1e-13)


def test_bandwidth_is_between_the_points_of_half_the_gain():
    """The cookbook's definition, exact for the analogue edges; at 100 Hz and 48 kHz warping is 1e-4 of a decibel."""
    f = design("peak", rate=48000, frequency=100, gain_db=12, bandwidth=2)
    assert decibels(f.response([50.0, 200.0])) == pytest.approx([6, 6], abs=1e-3)


def test_at_a_quarter_of_the_rate_the_middle_coefficient_is_nothing():
    """cos(pi / 2) computed in float64 would leave 6e-17, which no fixed-point word can hold."""
    assert design("notch", rate=48000, frequency=12000, q=1).sections()[0].b[1] == 0.0


# Standard Butterworth tables (from memory), recomputed: the q of each section, four decimals.
SECTION_Q = {
    2: [0.7071],
    4: [0.5412, 1.3066],
    6: [0.5176, 0.7071, 1.9319],
    8: [0.5098, 0.6013, 0.9, 2.5629],
    3: [1.0],
    5: [0.618, 1.618],
    7: [0.555, 0.8019, 2.247],
}


@pytest.mark.parametrize("order", SECTION_Q)
def test_butterworth_sections_have_the_q_of_the_tables(order):
    f = design("butterworth", rate=48000, response="low-pass", order=order, frequency=1000)
    analogue = [(pole - 1) / (pole + 1) for pole in f.zeros_poles().poles if pole.imag > 0]
    found = sorted(abs(s) / (-2 * s.real) for s in analogue)
    assert found == pytest.approx(SECTION_Q[order], abs=5e-5)


# Half-band closed forms by direct algebra.
@pytest.mark.parametrize(
    ("order", "b", "a"),
    [
        (2, [1 - FLAT, 2 - 2 * FLAT, 1 - FLAT], [1, 0, 3 - 2 * sqrt(2)]),
        (3, [1 / 6, 1 / 2, 1 / 2, 1 / 6], [1, 0, 1 / 3]),
    ],
)
def test_half_band_butterworth_filters_have_their_closed_forms(order, b, a):
    found_b, found_a = design("butterworth", rate=48000, response="low-pass", order=order, frequency=12000).whole()
    # The design is computed in float64: the two agree to about 4e-16, not to the bit.
    assert found_b == pytest.approx(b, abs=4e-16)
    assert found_a == pytest.approx(a, abs=4e-16)
    assert found_a[1] == 0.0


@pytest.mark.parametrize(
    ("response", "frequency", "zeros"),
    [
        ("low-pass", 20, [-1] * 6),
        ("high-pass", 20, [1] * 6),
        ("band-pass", (20, 200), [-1] * 6 + [1] * 6),
    ],
)
def test_butterworth_zeros_are_exact(response, frequency, zeros):
    found = design("butterworth", rate=48000, response=response, order=6, frequency=frequency).zeros_poles().zeros
    assert sorted(found, key=lambda zero: zero.real) == zeros


@pytest.mark.parametrize("response", ["low-pass", "high-pass", "band-pass", "band-stop"])
@pytest.mark.parametrize("order", [1, 2, 5, 8])
def test_classical_designs_are_stable_and_their_zeros_have_radius_one(response, order):
    frequency = (300, 900) if response.startswith("band") else 300
    for kind, more in (("butterworth", {}), ("elliptic", {"ripple_db": 0.1, "stopband_db": 70})):
        f = design(kind, rate=48000, response=response, order=order, frequency=frequency, **more)
        assert f.unstable_poles() == 0
        radii = [float(Fraction(z.real) ** 2 + Fraction(z.imag) ** 2) for z in f.factors[0].zeros]
        assert radii == [1.0] * (order if not response.startswith("band") else 2 * order)


@pytest.mark.parametrize("angle", [1e-3, 0.2, 0.5, 0.785, 0.79, 1.0, 1.5, 2.0, 2.5, 3.0, -0.3])
def test_a_root_put_on_the_circle_hardly_turns(angle):
    root = complex(np.exp(1j * angle)) * (1 + 3e-16)
    moved = on_circle(root)
    assert float(Fraction(moved.real) ** 2 + Fraction(moved.imag) ** 2) == 1.0
    assert abs(moved - root) < 2.0**-40


def test_a_root_too_near_an_axis_stays_where_it_is():
    root = complex(1 - 2.0**-52, 1e-9)
    assert on_circle(root) == root


# Oppenheim & Schafer, ch. 6, example (from memory): |H| within 1 +- 0.01 for 0.3 pi to 0.4 pi, at most 0.01 below
# 0.29 pi and above 0.41 pi. Denominator and largest radius computed for this project, ten and seven decimals.
OS_A = (
    *(1, -5.2258158439, 16.7847072872, -36.8831934498, 62.3969015615, -82.6537920646, 88.6743188605),
    *(-76.4726364287, 53.4097959907, -29.202122195, 12.2906738827, -3.5376374095, 0.6262814625),
)


def test_the_elliptic_band_pass_of_order_twelve_meets_its_mask():
    band_pass = design(
        "elliptic",
        rate=2,
        response="band-pass",
        order=6,
        frequency=(0.3, 0.4),
        ripple_db=20 * log10(1.01 / 0.99),
        stopband_db=20 * log10(1.01 / 0.01),
    )
    f = Filter.cascade([Filter.from_coefficients([1.01], rate=2), band_pass])
    # The edges are met with equality; 1e-12 is what rounded poles 0.007 from the circle leave of it.
    passed = np.abs(f.response(np.linspace(0.3, 0.4, 2001)))
    assert passed.min() > 0.99 - 1e-12 and passed.max() < 1.01 + 1e-12
    stopped = np.abs(f.response(np.concatenate([np.linspace(0, 0.29, 2001), np.linspace(0.41, 1, 2001)])))
    assert stopped.max() < 0.01 + 1e-12
    assert f.order == 12
    assert max(map(abs, f.zeros_poles().poles)) == pytest.approx(0.9933361, abs=5e-8)
    b, a = f.whole()
    assert a == pytest.approx(OS_A, abs=1e-9)
    assert b[0] == pytest.approx(0.0107597323, abs=1e-10)


VALID = {
    "low-pass": {"frequency": 100},
    "high-pass": {"frequency": 100},
    "band-pass": {"frequency": 100, "q": 1},
    "notch": {"frequency": 100, "q": 1},
    "all-pass": {"frequency": 100, "q": 1},
    "peak": {"frequency": 100, "gain_db": -3, "bandwidth": 1},
    "low-shelf": {"frequency": 100, "gain_db": -3, "q": 1},
    "high-shelf": {"frequency": 100, "gain_db": -3, "slope": 0.5},
    "butterworth": {"response": "band-stop", "order": 2, "frequency": [100, 200]},
    "elliptic": {"response": "low-pass", "order": 3, "frequency": 100, "ripple_db": 1, "stopband_db": 40},
    "chebyshev-1": {"response": "high-pass", "order": 3, "frequency": 100, "ripple_db": 1},
    "chebyshev-2": {"response": "band-pass", "order": 3, "frequency": [100, 200], "stopband_db": 40},
    "bessel": {"response": "low-pass", "order": 3, "frequency": 100},
    "a-weighting": {},
    "c-weighting": {"fit": "bilinear"},
    "itu-r-468": {"fit": "least-squares"},
    "k-weighting": {},
    "phono-replay": {"subsonic_us": 7950},
    "fm-de-emphasis": {"time_constant_us": 50},
    "octave-band": {"frequency": 1000},
    "third-octave-band": {"frequency": 31.5, "order": 3},
    "linkwitz-riley": {"order": 4, "frequency": 1800},
    "linkwitz-riley-3": {"frequency": [300, 3000]},
    "butterworth-crossover": {"order": 3, "frequency": 1800},
    "complementary": {"taps": 9, "frequency": 4000, "window": "hann"},
    "moving-average": {"length": 5},
    "dc-blocker": {"pole": 0.995},
    "fir-window": {"response": "low-pass", "taps": 9, "frequency": 4000, "window": "hamming"},
    "fir-least-squares": {"response": "low-pass", "taps": 9, "frequency": 4000, "stop_frequency": 8000},
    "fir-equiripple": {"response": "low-pass", "taps": 8, "frequency": 4000, "stop_frequency": 8000},
}


def test_every_kind_can_be_built():
    assert set(kinds()) == set(VALID) == set(KINDS)
    for kind, parameters in VALID.items():
        f = design(kind, rate=44100, **parameters)
        assert (f.rate, f.unstable_poles()) == (44100.0, 0)
        short = all(isinstance(factor, Polynomials) and len(factor.b) <= 3 for factor in f.factors)
        assert f.sections_given == short


def test_low_pass_and_high_pass_are_maximally_flat_unless_told_otherwise():
    assert design("low-pass", rate=48000, frequency=50) == design("low-pass", rate=48000, frequency=50, q=FLAT)


@pytest.mark.parametrize(
    ("kind", "parameters", "messages"),
    [
        ("peek", {}, ["there is no kind of filter 'peek'", 'Did you mean "peak"?', "butterworth"]),
        (3, {}, ["there is no kind of filter 3"]),
        ("low-pass", {}, ["frequency (cut-off or centre) is missing"]),
        (
            "low-pass",
            {"frequency": 24000},
            ["frequency is 24000, allowed is a number above 0 and below half the rate (24000)"],
        ),
        ("low-pass", {"frequency": 0}, ["frequency is 0"]),
        ("low-pass", {"frequency": True}, ["frequency is True"]),
        ("low-pass", {"frequency": 10**400}, ["frequency is 1000"]),
        ("low-pass", {"frequency": 100, "q": 0}, ["q is 0, allowed is a finite number above 0"]),
        ("low-pass", {"frequency": 100, "q": INF}, ["q is inf"]),
        ("low-pass", {"frequency": 100, "q": 1e-320}, ["no finite coefficients"]),
        ("low-pass", {"frequncy": 100}, ['parameter "frequncy" is unknown. Did you mean "frequency"?']),
        ("peak", {"frequency": 100, "gain_db": 121, "q": 1}, ["gain_db is 121, allowed is a number from -120 to 120"]),
        ("peak", {"frequency": 100, "gain_db": 1}, ["exactly one of q and bandwidth must be given, and neither is"]),
        ("peak", {"frequency": 100, "gain_db": 1, "q": 1, "bandwidth": 1}, ["and both are"]),
        (
            "peak",
            {"frequency": 23999.9, "gain_db": 1, "bandwidth": 9},
            ["at 48000 Hz with frequency 23999.9", "too wide"],
        ),
        (
            "low-shelf",
            {"frequency": 100, "gain_db": 12, "slope": 5.03},
            ["slope is 5.03; at 12 dB it must be below 5.02861"],
        ),
        ("butterworth", {**VALID["butterworth"], "order": 65}, ["order is 65, allowed is a whole number from 1 to 64"]),
        ("butterworth", {**VALID["butterworth"], "order": 2.0}, ["order is 2.0"]),
        ("butterworth", {**VALID["butterworth"], "frequency": [200, 100]}, ["frequency is [200, 100]"]),
        ("butterworth", {**VALID["butterworth"], "frequency": 100}, ["gives 1 edge, and a band-stop has 2"]),
        ("butterworth", {**VALID["butterworth"], "response": "low-pass"}, ["gives 2 edges, and a low-pass has 1"]),
        (
            "butterworth",
            {**VALID["butterworth"], "response": "lowpass"},
            ["response is 'lowpass', allowed is one of low-pass"],
        ),
        (
            "elliptic",
            {**VALID["elliptic"], "ripple_db": 3, "stopband_db": 2},
            ["stopband_db is 2; it must be above ripple_db, 3"],
        ),
        (
            "butterworth",
            {"response": "low-pass", "order": 64, "frequency": 1e-6},
            ["order 64", "leaves the range of float64"],
        ),
    ],
)
def test_a_mistake_is_named_with_what_is_allowed(kind, parameters, messages):
    with pytest.raises(FilterError) as caught:
        design(kind, rate=48000, **parameters)
    for message in messages:
        assert message in str(caught.value)


def test_all_mistakes_of_a_call_are_told_together():
    with pytest.raises(FilterError) as caught:
        design("peak", rate=-1, frequency=-2, q="wide", gian_db=3)
    message = str(caught.value)
    for part in ("rate is -1", "frequency is -2", "q is 'wide'", '"gian_db" is unknown', "gain_db (", "is missing"):
        assert part in message
    assert "\n" not in message


def test_the_limit_of_the_shelf_slope_is_where_the_formula_ends():
    just_below = design("low-shelf", rate=48000, frequency=100, gain_db=12, slope=5.0286)
    assert just_below.unstable_poles() == 0
