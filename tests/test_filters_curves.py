"""Standard curves: the published tables, the plain bilinear transform's errors, and what the fits make of them."""

from fractions import Fraction
from math import inf, pi

import numpy as np
import pytest
from levels import decibels

from streamhost.errors import FilterError
from streamhost.filters import curve_fit, design
from streamhost.filters.curves.analogue import CURVES
from streamhost.filters.curves.bands import THIRD_OCTAVES, exact_hz
from streamhost.filters.curves.fitted import FITTED
from streamhost.filters.curves.fitting import RATES, fitted
from streamhost.filters.curves.k_weighting import k_weighting
from streamhost.filters.curves.kinds import BILINEAR, LEAST_SQUARES, made_of
from streamhost.measure.weighting import a_weighting

# Kind and parameters of every curve of CURVES.
FITS = {
    "a-weighting": ("a-weighting", {}),
    "c-weighting": ("c-weighting", {}),
    "itu-r-468": ("itu-r-468", {}),
    "phono-replay": ("phono-replay", {}),
    "phono-replay, 7950 us": ("phono-replay", {"subsonic_us": 7950}),
    "fm-de-emphasis, 50 us": ("fm-de-emphasis", {"time_constant_us": 50}),
    "fm-de-emphasis, 75 us": ("fm-de-emphasis", {"time_constant_us": 75}),
}


def from_analogue_db(row):
    return row.found_db - row.goal.analogue_db


def found_at(fit, nominal_hz):
    """The row next to a nominal frequency."""
    return min(fit.rows, key=lambda row: abs(row.goal.hertz / nominal_hz - 1))


# --- A and C

# IEC 61672-1:2013, Table 3, as quoted: nominal A and C in dB, 10 Hz to 20 kHz in third octaves, one decimal.
A_TABLE = (
    *(-70.4, -63.4, -56.7, -50.5, -44.7, -39.4, -34.6, -30.2, -26.2, -22.5, -19.1, -16.1, -13.4, -10.9, -8.6, -6.6),
    *(-4.8, -3.2, -1.9, -0.8, 0.0, 0.6, 1.0, 1.2, 1.3, 1.2, 1.0, 0.5, -0.1, -1.1, -2.5, -4.3, -6.6, -9.3),
)
C_TABLE = (
    *(-14.3, -11.2, -8.5, -6.2, -4.4, -3.0, -2.0, -1.3, -0.8, -0.5, -0.3, -0.2, -0.1, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0),
    *(0.0, 0.0, 0.0, -0.1, -0.2, -0.3, -0.5, -0.8, -1.3, -2.0, -3.0, -4.4, -6.2, -8.5, -11.2),
)


@pytest.mark.parametrize(("name", "table"), [("a-weighting", A_TABLE), ("c-weighting", C_TABLE)])
def test_the_weightings_are_those_of_the_table(name, table):
    hertz = [exact_hz(nominal) for nominal in THIRD_OCTAVES]
    # Every cell rounds to the printed decimal.
    assert CURVES[name].decibels(hertz) == pytest.approx(np.array(table), abs=0.05)


def test_the_weightings_have_the_corners_of_the_standard():
    """IEC 61672-1:2013, Annex E, f1 to f4, recomputed for this project in all digits."""
    wanted = (20.598997057618316, 107.65264864304629, 737.8622307362901, 12194.217147998012)
    corners = sorted({-pole.real / (2 * pi) for pole in CURVES["a-weighting"].poles})
    assert corners == pytest.approx(wanted, rel=1e-13)  # a difference of squares costs three digits
    corners = sorted({-pole.real / (2 * pi) for pole in CURVES["c-weighting"].poles})
    assert corners == pytest.approx((wanted[0], wanted[3]), rel=1e-13)


def test_a_is_the_same_curve_that_noise_is_weighted_by():
    hertz = np.geomspace(10, 20000, 40)
    assert CURVES["a-weighting"].decibels(hertz) == pytest.approx(10 * np.log10(a_weighting(hertz)), abs=1e-10)


# Computed for this project: the plain bilinear transform of A at 48 kHz minus the analogue curve, three decimals.
A_ERRORS = {8000: -0.544, 10000: -1.216, 12500: -2.671, 15848.93: -6.214, 19952.6: -15.667}


def test_the_plain_transform_of_a_at_48_khz_errs_as_computed_and_still_keeps_class_1():
    hertz = list(A_ERRORS)
    found = decibels(design("a-weighting", rate=48000, fit=BILINEAR).response(hertz)) - CURVES["a-weighting"].decibels(hertz)
    assert found == pytest.approx(np.array(list(A_ERRORS.values())), abs=5.1e-4)
    # It keeps class 1 because the lower limits are -2.5, -3, -5, -16 dB and none.
    fit = curve_fit("a-weighting", 48000, BILINEAR)
    assert fit.met
    assert len(fit.rows) == 34
    assert from_analogue_db(found_at(fit, 16000)) == pytest.approx(-6.214, abs=5.1e-4)
    assert found_at(fit, 16000).goal.lower_db == -16


# IEC 61672-1:2013, Table 3, as quoted: upper and lower limits of class 1.
@pytest.mark.parametrize(
    ("nominal", "upper", "lower"),
    [
        *((10, 3.0, -inf), (12.5, 2.5, -inf), (16, 2.0, -4.0), (20, 2.0, -2.0), (25, 2.0, -1.5), (31.5, 1.5, -1.5)),
        *((40, 1.0, -1.0), (800, 1.0, -1.0), (1000, 0.7, -0.7), (1250, 1.0, -1.0), (4000, 1.0, -1.0), (5000, 1.5, -1.5)),
        *((6300, 1.5, -2.0), (8000, 1.5, -2.5), (10000, 2.0, -3.0), (12500, 2.0, -5.0), (16000, 2.5, -16.0)),
        (20000, 3.0, -inf),
    ],
)
def test_the_limits_of_the_weightings_are_those_of_class_1(nominal, upper, lower):
    for kind in ("a-weighting", "c-weighting"):
        goal = found_at(curve_fit(kind, 48000), nominal).goal
        assert (goal.upper_db, goal.lower_db) == (upper, lower)


# --- ITU-R 468

# Rec. ITU-R BS.468-4, Table 1, as quoted: dB re 1 kHz.
TABLE_468 = {
    31.5: -29.9, 63: -23.9, 100: -19.8, 200: -13.8, 400: -7.8, 800: -1.9, 1000: 0.0, 2000: 5.6, 3150: 9.0, 4000: 10.5,
    5000: 11.7, 6300: 12.2, 7100: 12.0, 8000: 11.4, 9000: 10.1, 10000: 8.1, 12500: 0.0, 14000: -5.3, 16000: -11.7,
    20000: -22.2, 31500: -42.7,
}


def test_the_468_network_gives_the_table():
    curve = CURVES["itu-r-468"]
    gains = curve.decibels([*TABLE_468, 1000])
    # Recomputed: within 0.0503 dB, the worst (100 Hz, -19.850) a tie of rounding.
    assert gains[:-1] - gains[-1] == pytest.approx(np.array(list(TABLE_468.values())), abs=0.0504)
    # The gain is set to the table's at 6.3 kHz; normalized at 1 kHz it would be 12.217 there.
    assert curve.decibels([6300.0, 1000.0]) == pytest.approx([12.2, 12.2 - 12.217], abs=5e-4)


def test_the_limits_of_468_follow_their_anchors():
    """The tolerances lie on straight lines over the logarithm of frequency; 6.3 kHz, 0 dB in print, has 0.01 dB here."""
    anchors = {31.5: 2.0, 100: 1.0, 1000: 0.5, 5000: 0.5, 6300: 0.0, 20000: 2.0}
    rows = curve_fit("itu-r-468", 96000).rows
    assert [row.goal.hertz for row in rows] == list(TABLE_468)
    for goal in (row.goal for row in rows[:-1]):
        drawn = np.interp(np.log(goal.hertz), np.log(list(anchors)), list(anchors.values()))
        # The print rounds to 0.05 dB below 1 kHz and to 0.1 dB above; 0.01 dB is the exception told above.
        assert goal.upper_db == pytest.approx(drawn, abs=0.05)
        assert goal.lower_db == -goal.upper_db
        assert goal.goal_db == TABLE_468[goal.hertz]
    assert (rows[-1].goal.upper_db, rows[-1].goal.lower_db) == (2.8, -inf)


# Computed for this project: errors of the plain bilinear transform at 48 kHz, normalized at 1 kHz, two decimals.
ERRORS_468 = {6300: -0.07, 8000: -0.97, 10000: -5.37, 12500: -12.62, 16000: -23.24}


def test_the_plain_transform_of_468_at_48_khz_fails_and_the_rows_are_named():
    fit = curve_fit("itu-r-468", 48000, BILINEAR)
    at_1_khz = from_analogue_db(found_at(fit, 1000))
    found = [from_analogue_db(found_at(fit, hertz)) - at_1_khz for hertz in ERRORS_468]
    assert found == pytest.approx(list(ERRORS_468.values()), abs=5.1e-3)
    assert not fit.met
    assert [row.goal.hertz for row in fit.failing] == [7100, 8000, 9000, 10000, 12500, 14000, 16000, 20000]
    assert fit.beyond_hz == (31500.0,)


# --- K

# Rec. ITU-R BS.1770, Annex 1, Tables 1 and 2, as quoted; response and impulse response computed for this project.
K_SECTIONS = (
    ((1.53512485958697, -2.69169618940638, 1.19839281085285), (1.0, -1.69065929318241, 0.73248077421585)),
    ((1.0, -2.0, 1.0), (1.0, -1.99004745483398, 0.99007225036621)),
)
K_RESPONSE = {
    20: -13.2754, 31.5: -7.79, 63: -2.6639, 100: -1.1335, 200: -0.2649, 400: -0.0148, 500: 0.0425, 997: 0.691,
    1000: 0.6977, 2000: 3.0713, 4000: 3.968, 8000: 4.0394, 10000: 4.0419, 16000: 4.0431, 20000: 4.0431,
}
K_IMPULSE = (
    *(1.53512485958697, -0.11160147885084633, -0.1031118890465834, -0.092970011217058548, -0.082039088620428916),
    *(-0.070984448825466419, -0.060298624858098005, -0.050326982482692273),
)


def exactly_filtered(section, x):
    b, a = ([Fraction(c) for c in side] for side in (section.b, section.a))
    y = []
    for n in range(len(x)):
        y.append(sum(b[k] * x[n - k] for k in range(min(n, 2) + 1)) - sum(a[k] * y[n - k] for k in range(1, min(n, 2) + 1)))
    return y


def test_k_weighting_at_48_khz_is_as_tabulated():
    f = design("k-weighting", rate=48000)
    assert tuple((section.b, section.a) for section in f.sections()) == K_SECTIONS
    assert decibels(f.response(list(K_RESPONSE))) == pytest.approx(np.array(list(K_RESPONSE.values())), abs=1e-4)  # its demand
    heard = [Fraction(n == 0) for n in range(len(K_IMPULSE))]
    for section in f.sections():
        heard = exactly_filtered(section, heard)
    # The tables' decimals become float64: 2^-53 of up to 2.7, and eight steps add that up.
    assert [float(h) for h in heard] == pytest.approx(K_IMPULSE, abs=1e-14)


@pytest.mark.parametrize("rate", [32000, 44100, 88200, 96000, 192000])
def test_k_weighting_at_another_rate_is_the_same_analogue_filter(rate):
    """Frequencies that the two bilinear transforms take from the same analogue frequency have the same gain."""
    f = design("k-weighting", rate=rate)
    hertz = np.geomspace(10, 0.49 * min(rate, 48000), 50)
    at_48 = 48000 / pi * np.arctan(rate / 48000 * np.tan(pi * hertz / rate))
    kept = at_48 < 24000
    # Poles 0.005 from the circle, or 0.001 at 192 kHz, rounded to 2^-53.
    assert decibels(f.response(hertz[kept])) == pytest.approx(decibels(k_weighting(48000).response(at_48[kept])), abs=1e-8)
    section = f.sections()[1]
    assert section.b == (section.b[0], -2 * section.b[0], section.b[0])
    assert f.unstable_poles() == 0


@pytest.mark.parametrize(("rate", "most_db"), [(44100, 0.0031), (48000, 0), (88200, 0.012), (96000, 0.013)])
def test_k_weighting_keeps_the_response_of_48_khz(rate, most_db):
    fit = curve_fit("k-weighting", rate)
    assert max(abs(row.deviation_db) for row in fit.rows) <= most_db
    assert fit.met
    assert "own budget" in fit.limits


# --- phono replay and FM de-emphasis

# IEC 60098, as quoted, computed from the time constants: dB re 1 kHz, plain and with the pole of 7950 us.
PHONO = {
    20: (19.274, 16.261), 30: (18.593, 16.995), 40: (17.792, 16.823), 50: (16.946, 16.302), 60: (16.101, 15.644),
    80: (14.506, 14.244), 100: (13.088, 12.92), 150: (10.271, 10.196), 200: (8.219, 8.178), 300: (5.484, 5.467),
    400: (3.784, 3.775), 500: (2.648, 2.642), 800: (0.751, 0.75), 1000: (0.0, 0.0), 1500: (-1.395, -1.394),
    2000: (-2.589, -2.587), 3000: (-4.74, -4.739), 4000: (-6.605, -6.604), 5000: (-8.21, -8.208),
    6000: (-9.599, -9.597), 8000: (-11.894, -11.892), 10000: (-13.734, -13.733), 12000: (-15.264, -15.262),
    15000: (-17.157, -17.155), 20000: (-19.62, -19.619),
}
# Rec. ITU-R BS.450, as quoted, computed: dB re 0 Hz, 50 and 75 us.
FM = {
    100: (-0.004, -0.01), 500: (-0.106, -0.235), 1000: (-0.409, -0.871), 3000: (-2.761, -4.769), 5000: (-5.4, -8.164),
    10000: (-10.362, -13.656), 15000: (-13.656, -17.073),
}


@pytest.mark.parametrize(
    ("table", "names"),
    [
        (PHONO, ("phono-replay", "phono-replay, 7950 us")),
        (FM, ("fm-de-emphasis, 50 us", "fm-de-emphasis, 75 us")),
    ],
)
def test_time_constants_give_the_tables(table, names):
    for column, name in enumerate(names):
        wanted = np.array([row[column] for row in table.values()])
        assert CURVES[name].decibels(list(table)) == pytest.approx(wanted, abs=5.1e-4), name


# Computed for this project: errors of the plain bilinear transform re 1 kHz, two decimals.
@pytest.mark.parametrize(
    ("rate", "errors"),
    [
        (48000, {5000: -0.27, 10000: -1.33, 15000: -3.61, 20000: -9.06}),
        (96000, {5000: -0.07, 10000: -0.30, 15000: -0.73, 20000: -1.37}),
    ],
)
def test_the_plain_transform_of_phono_replay_errs_as_computed(rate, errors):
    fit = curve_fit("phono-replay", rate, BILINEAR)
    found = [from_analogue_db(found_at(fit, hertz)) for hertz in errors]
    assert found == pytest.approx(list(errors.values()), abs=5.1e-3)
    assert not fit.met


# --- the fits

# Most that a fit is away from its analogue curve at a frequency of its standard, found for this project and rounded up.
FARTHEST_DB = {44100: 0.036, 48000: 0.052, 88200: 2e-4, 96000: 1e-4}


@pytest.mark.parametrize("rate", RATES)
@pytest.mark.parametrize("name", CURVES)
def test_the_fit_keeps_the_limits_and_hugs_the_curve(name, rate):
    kind, parameters = FITS[name]
    fit = curve_fit(kind, rate, LEAST_SQUARES, **parameters)
    assert fit.met
    assert max(abs(from_analogue_db(row)) for row in fit.rows) < FARTHEST_DB[rate]
    assert fit == curve_fit(kind, rate, **parameters)


@pytest.mark.parametrize("rate", RATES)
@pytest.mark.parametrize("name", CURVES)
def test_the_fit_is_stable_and_has_the_order_that_is_told(name, rate):
    kind, parameters = FITS[name]
    f = design(kind, rate=rate, **parameters)
    grown = kind in ("phono-replay", "fm-de-emphasis")
    assert f.order == len(CURVES[name].poles) + grown
    assert f.unstable_poles() == 0
    zeros = f.zeros_poles().zeros
    assert zeros.count(1) == CURVES[name].zeros.count(0)
    assert all(abs(zero) <= 1 for zero in zeros)


@pytest.mark.parametrize("name", CURVES)
def test_zeros_of_the_plain_transform_lie_where_they_belong(name):
    kind, parameters = FITS[name]
    zeros = design(kind, rate=48000, fit=BILINEAR, **parameters).zeros_poles().zeros
    curve = CURVES[name]
    assert zeros.count(1) == curve.zeros.count(0)
    assert zeros.count(-1) == len(curve.poles) - len(curve.zeros)


def test_every_curve_is_fitted_at_every_rate():
    assert set(FITTED) == {(name, rate) for name in CURVES for rate in RATES}


@pytest.mark.parametrize("rate", RATES)
@pytest.mark.parametrize("name", CURVES)
def test_the_table_of_fits_is_found_again(name, rate):
    again = made_of(fitted(name, rate), CURVES[name], rate)
    kept = made_of(FITTED[name, rate], CURVES[name], rate)
    hertz = np.geomspace(20, 20000, 100)
    # Roots move along flat directions; starts moved by 1e-3 changed the response by up to 8e-8 dB.
    assert decibels(again.response(hertz)) == pytest.approx(decibels(kept.response(hertz)), abs=1e-6)


# --- mistakes


@pytest.mark.parametrize(
    ("kind", "rate", "parameters", "message"),
    [
        ("a-weighting", 50000, {}, 'kept for the rates 44100, 48000, 88200, 96000 Hz; at 50000 Hz fit = "bilinear" is'),
        ("a-weighting", 48000, {"fit": "best"}, "fit is 'best', allowed is one of bilinear, least-squares"),
        ("k-weighting", 48000, {"q": 1}, 'parameter "q" is unknown. Known are none'),
        ("phono-replay", 48000, {"subsonic_us": 20}, "subsonic_us is 20, allowed is one of 0, 7950"),
        ("fm-de-emphasis", 48000, {}, "time_constant_us (time constant) is missing, allowed is one of 50, 75"),
        ("octave-band", 48000, {"frequency": 1100}, "frequency is 1100, allowed is one of 16, 31.5, 63"),
        ("octave-band", 44100, {"frequency": 16000}, "22387.2 Hz; it must be below half the rate, 22050"),
    ],
)
def test_mistakes_are_named(kind, rate, parameters, message):
    with pytest.raises(FilterError) as caught:
        design(kind, rate=rate, **parameters)
    assert message in str(caught.value)
    with pytest.raises(FilterError) as caught:
        curve_fit(kind, rate, **parameters)
    assert message in str(caught.value)


def test_only_standard_curves_are_judged():
    with pytest.raises(FilterError, match=r"'a-wieghting' is no standard curve. Did you mean \"a-weighting\"\?"):
        curve_fit("a-wieghting", 48000)
    with pytest.raises(FilterError, match="'peak' is no standard curve"):
        curve_fit("peak", 48000, frequency=1000, gain_db=3, q=1)
