"""The classical families beyond Butterworth and elliptic: Chebyshev's two and Bessel's."""

from fractions import Fraction
from math import cos, pi, tan

import numpy as np
import pytest
from levels import decibels

from streamhost.errors import FilterError
from streamhost.filters import design

RATE = 48000


def prototype_poles(f, edge):
    """The analogue poles behind a low-pass, with the edge at 1 rad/s: the prewarped bilinear transform undone."""
    return np.array([(p - 1) / (p + 1) / tan(pi * edge / f.rate) for p in f.zeros_poles().poles])


# Handbook pole tables, ripple edge at 1 rad/s, read second-hand and recomputed: -sigma +- j omega, five decimals.
HALF_DECIBEL = {
    1: [(2.86278, 0)],
    2: [(0.71281, 1.00404)],
    3: [(0.31323, 1.02193), (0.62646, 0)],
    4: [(0.17535, 1.01625), (0.42334, 0.42095)],
    5: [(0.11196, 1.01156), (0.29312, 0.62518), (0.36232, 0)],
}


@pytest.mark.parametrize("order", HALF_DECIBEL)
def test_chebyshev_poles_are_those_of_the_tables(order):
    f = design("chebyshev-1", rate=RATE, response="low-pass", order=order, frequency=5000, ripple_db=0.5)
    upper = sorted(((-p.real, p.imag) for p in prototype_poles(f, 5000) if p.imag >= 0), key=lambda pole: -pole[1])
    # Half of the last printed decimal.
    assert np.array(upper) == pytest.approx(np.array(HALF_DECIBEL[order]), abs=5.1e-6)


# The same tables: denominators in descending powers, seven decimals.
@pytest.mark.parametrize(
    ("ripple_db", "denominator"),
    [
        (0.5, [1, 1.4256245, 1.5162026]),
        (0.5, [1, 1.252913, 1.5348955, 0.7156938]),
        (1.0, [1, 1.0977343, 1.1025103]),
        (1.0, [1, 0.9883412, 1.2384092, 0.4913067]),
        (1.0, [1, 0.9528114, 1.4539248, 0.7426194, 0.2756276]),
    ],
)
def test_chebyshev_denominators_are_those_of_the_tables(ripple_db, denominator):
    order = len(denominator) - 1
    f = design("chebyshev-1", rate=RATE, response="low-pass", order=order, frequency=5000, ripple_db=ripple_db)
    assert np.poly(prototype_poles(f, 5000)).real == pytest.approx(denominator, abs=5.1e-8)


@pytest.mark.parametrize("order", [1, 2, 3, 6, 9])
def test_the_first_kind_follows_its_polynomial(order):
    """|H|^2 = 1 / (1 + e^2 T_n(w)^2), by definition, w the prewarped frequency over the prewarped edge."""
    edge, ripple_db = 3000, 0.7
    f = design("chebyshev-1", rate=RATE, response="low-pass", order=order, frequency=edge, ripple_db=ripple_db)
    hertz = np.linspace(0, edge, 101)
    w = np.clip(np.tan(pi * hertz / RATE) / tan(pi * edge / RATE), 0, 1)
    wanted = -10 * np.log10(1 + (10 ** (ripple_db / 10) - 1) * np.cos(order * np.arccos(w)) ** 2)
    # Poles rounded to 2^-53 at a distance of 1e-2 or more from the circle.
    assert decibels(f.response(hertz)) == pytest.approx(wanted, abs=1e-10)
    assert decibels(f.response(edge)) == pytest.approx(-ripple_db, abs=1e-10)


@pytest.mark.parametrize("order", [2, 3, 6, 9])
def test_the_second_kind_reaches_its_attenuation_at_the_edge_and_keeps_it(order):
    edge, stopband_db = 3000, 55
    f = design("chebyshev-2", rate=RATE, response="low-pass", order=order, frequency=edge, stopband_db=stopband_db)
    assert decibels(f.response([0.0, edge])) == pytest.approx([0, -stopband_db], abs=1e-9)
    assert np.abs(f.response(np.linspace(edge, RATE / 2, 2001))).max() < 10 ** (-stopband_db / 20) * (1 + 1e-9)
    # Falling all the way; near 0 Hz by less than the response is rounded.
    assert np.diff(np.abs(f.response(np.linspace(0, edge, 201)))).max() < 1e-12
    # Zeros at 1 / cos((2k - 1) pi / 2n) times the edge, by definition.
    nulls = sorted(abs(1 / cos((2 * k - 1) * pi / (2 * order))) for k in range(1, order // 2 + 1))
    found = sorted(tan(np.angle(z) / 2) / tan(pi * edge / RATE) for z in f.zeros_poles().zeros if z.imag > 0)
    assert found == pytest.approx(nulls, rel=1e-10)


def reverse_bessel(order):
    """Coefficients in ascending powers of s: theta_n = (2n - 1) theta_(n-1) + s^2 theta_(n-2)."""
    before, now = [1], [1, 1]
    for n in range(2, order + 1):
        longer = [(2 * n - 1) * c for c in now] + [0]
        before, now = now, [x + y for x, y in zip(longer, [0, 0, *before], strict=True)]
    return now


@pytest.mark.parametrize("order", [1, 2, 3, 5, 8, 12])
def test_bessel_poles_are_roots_of_the_reverse_bessel_polynomial(order):
    wanted = reverse_bessel(order)[::-1]
    common = {"rate": RATE, "response": "low-pass", "order": order, "frequency": 4000}
    delay = np.poly(prototype_poles(design("bessel", **common, norm="delay"), 4000)).real
    # The roots of a polynomial whose coefficients span 13 decades keep fewer digits than one rounding.
    assert delay == pytest.approx(wanted, rel=1e-8)
    phase = np.poly(prototype_poles(design("bessel", **common, norm="phase"), 4000)).real
    assert phase[-1] == pytest.approx(1, rel=1e-9)
    magnitude = design("bessel", **common)
    assert magnitude == design("bessel", **common, norm="magnitude")
    # Half the power, -3.0103 dB.
    assert abs(magnitude.response(4000.0)) == pytest.approx(0.5**0.5, rel=1e-10)


FAMILIES = [
    ("chebyshev-1", {"ripple_db": 0.5}),
    ("chebyshev-2", {"stopband_db": 60}),
    ("bessel", {}),
    ("bessel", {"norm": "delay"}),
]


@pytest.mark.parametrize(("kind", "more"), FAMILIES)
@pytest.mark.parametrize("response", ["low-pass", "high-pass", "band-pass", "band-stop"])
@pytest.mark.parametrize("order", [1, 2, 5, 8, 25])
def test_zeros_lie_on_the_circle_and_poles_inside_it(kind, more, response, order):
    banded = response.startswith("band")
    f = design(kind, rate=RATE, response=response, order=order, frequency=(300, 900) if banded else 300, **more)
    assert f.unstable_poles() == 0
    assert f.order == (2 * order if banded else order)
    zeros = f.zeros_poles().zeros
    assert [float(Fraction(z.real) ** 2 + Fraction(z.imag) ** 2) for z in zeros] == [1.0] * f.order
    if kind != "chebyshev-2" and response != "band-stop":
        at = {"low-pass": {-1}, "high-pass": {1}, "band-pass": {-1, 1}}[response]
        assert set(zeros) == at


@pytest.mark.parametrize(
    ("kind", "parameters", "message"),
    [
        ("bessel", {"order": 26}, "order is 26, allowed is a whole number from 1 to 25"),
        ("bessel", {"order": 2, "norm": "flat"}, "norm is 'flat', allowed is one of magnitude, phase, delay"),
        ("chebyshev-1", {"order": 2}, "ripple_db (ripple in the pass-band) is missing"),
        ("chebyshev-2", {"order": 2, "stopband_db": 0}, "stopband_db is 0"),
        ("chebyshev-2", {"order": 2, "stopband_db": 40, "frequency": [1, 2]}, "gives 2 edges, and a low-pass has 1"),
    ],
)
def test_mistakes_are_named(kind, parameters, message):
    with pytest.raises(FilterError) as caught:
        design(kind, rate=RATE, **{"response": "low-pass", "frequency": 1000, **parameters})
    assert message in str(caught.value)
