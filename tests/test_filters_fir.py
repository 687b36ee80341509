"""Linear-phase filters, the moving average and the DC blocker."""

from math import pi

import numpy as np
import pytest

from streamhost.errors import FilterError
from streamhost.filters import design

RATE = 48000
EDGES = {"low-pass": 6000, "high-pass": 6000, "band-pass": (5000, 9000), "band-stop": (5000, 9000)}
STOP_EDGES = {"low-pass": 8000, "high-pass": 4000, "band-pass": (3500, 10500), "band-stop": (6500, 7500)}
WINDOWS = [{"window": word} for word in ("rectangular", "hann", "hamming", "blackman")] + [{"beta": 6.0}]


def taps_of(f):
    b, a = f.whole()
    assert a == (1.0,)
    return np.array(b)


def passed_hertz(response):
    """One frequency well inside the pass-band."""
    return {"low-pass": 0.0, "high-pass": RATE / 2, "band-pass": 7000.0, "band-stop": 0.0}[response]


def designed(kind, response, taps, **more):
    if kind != "fir-window":
        more = {"stop_frequency": STOP_EDGES[response], **more}
    elif not more:
        more = {"window": "hamming"}
    return design(kind, rate=RATE, response=response, taps=taps, frequency=EDGES[response], **more)


@pytest.mark.parametrize("kind", ["fir-window", "fir-least-squares", "fir-equiripple"])
@pytest.mark.parametrize("response", EDGES)
def test_taps_are_symmetric_to_the_last_bit(kind, response):
    taps = taps_of(designed(kind, response, 31))
    assert len(taps) == 31
    assert np.array_equal(taps, taps[::-1])


@pytest.mark.parametrize("more", WINDOWS)
@pytest.mark.parametrize("response", EDGES)
def test_windowed_gain_is_one_where_it_is_said_and_half_at_the_edges(response, more):
    f = designed("fir-window", response, 301, **more)
    assert abs(f.response(passed_hertz(response))) == pytest.approx(1, abs=1e-14 * 301)  # one rounding a tap
    # The edge lies in the middle of the window's own transition; the other edge is 40 of its side lobes away.
    assert np.abs(f.response(np.atleast_1d(EDGES[response]))) == pytest.approx(0.5, abs=0.01)


@pytest.mark.parametrize(("more", "window"), [
    ({"window": "rectangular"}, "boxcar"), ({"window": "hamming"}, "hamming"), ({"beta": 6.0}, ("kaiser", 6.0)),
])
@pytest.mark.parametrize(("response", "taps"), [
    ("low-pass", 24), ("low-pass", 27), ("band-pass", 24), ("band-pass", 27), ("high-pass", 27), ("band-stop", 27),
])
def test_windowed_taps_are_those_of_scipy(response, taps, more, window):
    from scipy import signal

    wanted = signal.firwin(taps, EDGES[response], window=window, pass_zero=response.replace("-", ""), fs=RATE)
    # Both are sums of a few products of numbers up to 1, in another order.
    assert taps_of(designed("fir-window", response, taps, **more)) == pytest.approx(wanted, abs=1e-14)


# Hann's and Blackman's windows by their formulas, at the n-th of 28 equal steps: 1 to 27 are the taps.
def hann(n):
    return 0.5 - 0.5 * np.cos(2 * pi * n / 28)


def blackman(n):
    return 0.42 - 0.5 * np.cos(2 * pi * n / 28) + 0.08 * np.cos(4 * pi * n / 28)


@pytest.mark.parametrize("window", [hann, blackman])
def test_no_tap_is_lost_to_a_window_that_ends_in_zeros(window):
    taps = taps_of(designed("fir-window", "low-pass", 27, window=window.__name__))
    n = np.arange(1, 28)
    # The edge is a quarter of half the rate; the middle tap is the ideal response's largest.
    assert taps / taps[13] == pytest.approx(np.sinc((n - 14) / 4) * window(n), abs=1e-15)
    assert taps[0] != 0


def test_taps_that_are_nothing_are_exactly_nothing():
    """A low-pass at a quarter of the rate: every second tap beside the middle is 0, and at the ends is no tap."""
    taps = taps_of(design("fir-window", rate=RATE, response="low-pass", taps=11, frequency=12000, window="hamming"))
    assert len(taps) == 11
    assert np.array_equal(np.flatnonzero(taps == 0), [1, 3, 7, 9])
    shorter = taps_of(design("fir-window", rate=RATE, response="low-pass", taps=9, frequency=12000, window="hamming"))
    assert len(shorter) == 7


# Oppenheim & Schafer, ch. 7 (from memory): cut-off pi/2, transition 0.4 pi to 0.6 pi, error at most 0.001: Kaiser's
# formulas give beta 5.653 and order 37.
def test_the_published_kaiser_low_pass_keeps_its_error():
    f = design("fir-window", rate=2, response="low-pass", taps=38, frequency=0.5, beta=5.653)
    assert np.abs(np.abs(f.response(np.linspace(0, 0.4, 1001))) - 1).max() < 0.001
    assert np.abs(f.response(np.linspace(0.6, 1, 1001))).max() < 0.001


# Oppenheim & Schafer, ch. 7 (from memory): pass-band to 0.4 pi within 0.01, stop-band from 0.6 pi within 0.001; order
# 26 has errors of 0.0116 and 0.00116 and fails, order 27 has 0.0092 and 0.00092. Half of the last printed digit.
@pytest.mark.parametrize(("taps", "error", "printed"), [(27, 0.0116, 5e-5), (28, 0.0092, 5e-5)])
def test_the_published_equiripple_low_pass_has_its_errors(taps, error, printed):
    f = design("fir-equiripple", rate=2, response="low-pass", taps=taps, frequency=0.4, stop_frequency=0.6, stop_weight=10)
    passed = np.abs(np.abs(f.response(np.linspace(0, 0.4, 2001))) - 1).max()
    stopped = np.abs(f.response(np.linspace(0.6, 1, 2001))).max()
    assert passed == pytest.approx(error, abs=printed)
    assert stopped == pytest.approx(error / 10, abs=printed / 10)


def amplitude_matrix(taps, hertz):
    """What turns the middle tap and those after it, of an odd number, into the response with the delay taken out."""
    time = np.arange((taps + 1) // 2)
    return np.cos(2 * pi * np.outer(hertz, time) / RATE) * np.where(time == 0, 1.0, 2.0)


def amplitude(taps, hertz):
    return amplitude_matrix(len(taps), hertz) @ taps[len(taps) // 2 :]


def bands(response):
    """Points of pass-band and stop-band."""
    grid = np.linspace(0, RATE / 2, 24001)
    edges, stops = EDGES[response], STOP_EDGES[response]
    return {
        "low-pass": lambda: (grid[grid <= edges], grid[grid >= stops]),
        "high-pass": lambda: (grid[grid >= edges], grid[grid <= stops]),
        "band-pass": lambda: (
            grid[(grid >= edges[0]) & (grid <= edges[1])], grid[(grid <= stops[0]) | (grid >= stops[1])]),
        "band-stop": lambda: (
            grid[(grid <= edges[0]) | (grid >= edges[1])], grid[(grid >= stops[0]) & (grid <= stops[1])]),
    }[response]()


@pytest.mark.parametrize("response", EDGES)
def test_equiripple_alternates_as_often_as_the_theorem_asks(response):
    """The alternation theorem (Oppenheim & Schafer, ch. 7): (taps - 1) / 2 + 2 extremal errors of changing sign."""
    taps, weight = 31, 5.0
    found = taps_of(designed("fir-equiripple", response, taps, stop_weight=weight))
    passed, stopped = bands(response)
    hertz = np.concatenate([passed, stopped])
    error = np.concatenate([amplitude(found, passed) - 1, weight * amplitude(found, stopped)])[np.argsort(hertz)]
    # 64 points a free tap place an extremum to 1e-3 of its height.
    extremal = np.sign(error[np.abs(error) > 0.99 * np.abs(error).max()])
    assert 1 + np.count_nonzero(np.diff(extremal)) >= (taps - 1) // 2 + 2


@pytest.mark.parametrize("response", EDGES)
def test_least_squares_are_those_of_a_fine_grid(response):
    """The same problem solved on a grid of 1 Hz: the integral by the trapezoidal rule, which halves a band's ends."""
    weight = 3.0
    rows, wanted = [], []
    for hertz, gain, weighted in zip(bands(response), (1.0, 0.0), (1.0, weight), strict=True):
        end = np.concatenate([[True], np.diff(hertz) > 1.5]) | np.concatenate([np.diff(hertz) > 1.5, [True]])
        root = np.sqrt(weighted * np.where(end, 0.5, 1.0))
        rows.append(root[:, None] * amplitude_matrix(31, hertz))
        wanted.append(root * gain)
    half = np.linalg.lstsq(np.concatenate(rows), np.concatenate(wanted))[0]
    found = taps_of(designed("fir-least-squares", response, 31, stop_weight=weight))
    # The rule's error, (2 pi 15 / 48000)^2 / 12 = 3e-7 of an integral of the fastest cosine, by the problem's condition.
    assert found[15:] == pytest.approx(half, abs=2e-6)


@pytest.mark.parametrize(
    ("kind", "parameters", "message"),
    [
        ("fir-window", {"taps": 10, "window": "hann", "beta": 3}, "exactly one of window and beta must be given"),
        ("fir-window", {"taps": 10}, "and neither is"),
        ("fir-window", {"taps": 2, "window": "hann"}, "taps is 2, allowed is a whole number from 3 to 4096"),
        ("fir-window", {"taps": 9, "window": "flat"}, "window is 'flat', allowed is one of rectangular"),
        ("fir-window", {"response": "high-pass", "taps": 10, "window": "hann"},
         "taps is 10; a high-pass passes half the rate, which needs an odd number"),
        ("fir-least-squares", {"taps": 10, "stop_frequency": 8000}, "the least-squares method takes an odd number"),
        ("fir-equiripple", {"taps": 9, "stop_frequency": 5000},
         "stop_frequency is 5000.0; of a low-pass it lies above the edge of the pass-band, 6000.0"),
        ("fir-equiripple", {"taps": 9, "stop_frequency": [7000, 8000]}, "stop_frequency gives 2 edges"),
        ("fir-equiripple", {"taps": 601, "frequency": 1000, "stop_frequency": 12000}, "does not converge"),
    ],
)
def test_mistakes_are_named(kind, parameters, message):
    with pytest.raises(FilterError) as caught:
        design(kind, rate=RATE, **{"response": "low-pass", "frequency": 6000, **parameters})
    assert message in str(caught.value)


# --- moving average

# Textbook facts of the Dirichlet kernel (from memory), side lobes computed: dB, and frequency times length over rate.
SIDE_LOBES = {8: (-12.797, 1.438), 64: (-13.254, 1.4304)}


@pytest.mark.parametrize("length", SIDE_LOBES)
def test_the_moving_average_has_its_nulls_and_its_first_side_lobe(length):
    f = design("moving-average", rate=RATE, length=length)
    taps = taps_of(f)
    assert np.array_equal(taps, [1 / length] * length)
    nulls = np.arange(1, length // 2 + 1) * RATE / length
    # Sums of `length` roundings of 2^-53 each.
    assert np.abs(f.response(nulls)).max() < 1e-14
    assert f.response(0.0) == pytest.approx(1, abs=1e-14)
    positions = np.arange(1.42, 1.45, 1e-4)
    gains = 20 * np.log10(np.abs(f.response(positions * RATE / length)))
    level, position = SIDE_LOBES[length]
    assert gains.max() == pytest.approx(level, abs=5e-4)
    assert positions[gains.argmax()] == pytest.approx(position, abs=2e-4)  # the grid, and half of the last digit
    assert np.sum(taps**2) == pytest.approx(1 / length, rel=1e-14)


def test_a_moving_average_of_one_is_a_wire():
    assert design("moving-average", rate=RATE, length=1).whole() == ((1.0,), (1.0,))


# --- DC blocker


def test_the_dc_blocker_has_one_multiplication_and_no_gain_at_dc():
    f = design("dc-blocker", rate=RATE, pole=0.995)
    assert f.whole() == ((1.0, -1.0), (1.0, -0.995))
    assert f.response(0.0) == 0
    assert f.response(RATE / 2) == pytest.approx(2 / 1.995, rel=1e-15)


@pytest.mark.parametrize("frequency", [0.1, 5, 20, 12000, 20000])
def test_the_dc_blocker_is_three_decibels_down_at_its_frequency(frequency):
    f = design("dc-blocker", rate=RATE, frequency=frequency)
    down = abs(f.response(frequency)) / abs(f.response(RATE / 2))
    # A pole next to 1 is rounded by 2^-54, of its distance 1.3e-5 (at 0.1 Hz) that is 4e-12.
    assert down == pytest.approx(0.5**0.5, rel=1e-11)


@pytest.mark.parametrize(
    ("parameters", "message"),
    [
        ({}, "exactly one of frequency and pole must be given, and neither is"),
        ({"pole": 1}, "pole is 1, allowed is a number above 0 and below 1"),
        ({"pole": 0}, "pole is 0"),
        ({"frequency": 1e-13}, "rounds to the unit circle"),
    ],
)
def test_a_dc_blocker_that_cannot_be_is_refused(parameters, message):
    with pytest.raises(FilterError) as caught:
        design("dc-blocker", rate=RATE, **parameters)
    assert message in str(caught.value)
