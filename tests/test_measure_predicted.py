"""Predicted noise against closed forms, and against what is measured."""

import numpy as np
import pytest

from streamhost import Filter, Fixed, design, realize
from streamhost.diagram.norms import norms_from_input
from streamhost.measure import measure, predicted_noise
from streamhost.measure.frequencies import breakpoints, integral, refined
from streamhost.measure.levels import power_dbfs
from streamhost.measure.weighting import a_weighting
from streamhost.signals import white

RATE = 48000
BAND = (20.0, 20000.0)
FINE = "Q2.30"
"""Coefficients that drop 30 bits: errors are continuous to 1e-18 of their variance."""

# First order, 1/(1 - a z^-1): noise gain (B. Gold, C. M. Rader, 1966; Oppenheim & Schafer, ch. 6; table from memory).
FIRST_ORDER = {0.5: 1.333333, 0.9: 5.263158, 0.95: 10.25641, 0.99: 50.251256, 0.999: 500.250125}

# Second order, poles r exp(+-j theta): noise gain of 1/A (Jackson 1970; Oppenheim & Schafer, ch. 6; from memory).
SECOND_ORDER = {(0.9, 0.785398163): 5.7523, (0.99, 0.785398163): 50.7512, (0.99, 0.1): 2520.9973,
                (0.99, 0.130899694): 1480.9521}

# Low-pass of the "Audio EQ cookbook", q = 1/sqrt 2, direct form 1 with one rounding: full-band noise in dBFS for 16 and
# 24 bits. Computed for this project from the same closed form, three ways.
LOW_PASS = {20: (-25.13, -73.29), 100: (-46.03, -94.2), 1000: (-75.31, -123.47)}


def recursive(a, signal="Q1.15"):
    """1 / A in direct form 1."""
    filter = Filter.from_coefficients([1.0], a, rate=RATE)
    return realize(filter, form="direct-1", format=Fixed(signal, coefficients=FINE))


def gain_of(realization):
    """Predicted power over that of one rounding, (2^-15)^2 / 12."""
    full = predicted_noise(realization.program, RATE).full_dbfs
    return 10.0 ** (full / 10.0) / 2.0 / (2.0**-30 / 12.0)


def stored(realization):
    """Coefficients by their label, as stored."""
    diagram = realization.program.diagram
    return {slot.label: value for slot, value in zip(diagram.slots, diagram.values[:, 0], strict=True)}


@pytest.mark.parametrize("a", FIRST_ORDER)
def test_first_order(a):
    realization = recursive([1.0, -a])
    exact = next(value for label, value in stored(realization).items() if label.startswith("a1"))
    dropped = 1 if a == 0.5 else 30  # times 0.5, a product has one bit more than the signal and no others
    share = 1.0 - 4.0**-dropped
    assert gain_of(realization) == pytest.approx(share / (1.0 - exact**2), rel=1e-9)  # of the coefficient as stored
    assert gain_of(realization) == pytest.approx(share * FIRST_ORDER[a], rel=1e-6)  # digits given; a has 30 bits


@pytest.mark.parametrize(("radius", "angle"), SECOND_ORDER)
def test_second_order(radius, angle):
    realization = recursive([1.0, -2.0 * radius * np.cos(angle), radius**2])
    values = stored(realization)
    a1, a2 = (next(value for label, value in values.items() if label.startswith(name)) for name in ("a1", "a2"))
    closed = (1.0 + a2) / (1.0 - a2) / ((1.0 + a2) ** 2 - a1**2)
    assert gain_of(realization) == pytest.approx(closed, rel=1e-9)  # of the coefficients as stored
    assert gain_of(realization) == pytest.approx(SECOND_ORDER[radius, angle], rel=1e-4)  # digits given


@pytest.mark.parametrize("frequency", LOW_PASS)
@pytest.mark.parametrize("word", ["Q1.15", "Q1.23"])
def test_low_pass(frequency, word):
    wanted = LOW_PASS[frequency][word == "Q1.23"]
    filter = design("low-pass", rate=RATE, frequency=frequency, q=2**-0.5)
    realization = realize(filter, form="direct-1", format=Fixed(word, coefficients=FINE))
    assert predicted_noise(realization.program, RATE).full_dbfs == pytest.approx(wanted, abs=0.01)  # digits given
    measured = measure(realization, white(10 * RATE, 1, 1, -3.0), BAND)
    if (frequency, word) == (20, "Q1.15"):
        assert measured.white.holds is False
        return
    assert measured.white.holds, measured.white.reason
    assert measured.noise.full_dbfs == pytest.approx(wanted, abs=1.0)  # as the check asks
    allowed = max(0.5, measured.noise.interval_db)
    assert measured.noise.dbfs == pytest.approx(measured.prediction.dbfs, abs=allowed)


def test_low_pass_where_only_dither_makes_it_white():
    """At 20 Hz a 16-bit output moves by less than a step a frame, whatever comes in, and sticks. Dither frees it, and
    its noise is 4.77 dB more (AES17's triangular dither): three times the variance of plain rounding."""
    filter = design("low-pass", rate=RATE, frequency=20.0, q=2**-0.5)
    realization = realize(filter, form="direct-1", format=Fixed("Q1.15", coefficients=FINE, dither="tpdf"))
    measured = measure(realization, white(40 * RATE, 1, 1, -20.0), BAND)
    assert measured.white.holds, measured.white.reason
    assert measured.prediction.full_dbfs == pytest.approx(LOW_PASS[20][0] + 4.77, abs=0.01)  # digits given
    assert measured.noise.full_dbfs == pytest.approx(measured.prediction.full_dbfs, abs=1.0)  # as the check asks


@pytest.mark.parametrize("a", [[1.0, -0.9512345], [1.0, -0.999], [1.0, -1.98 * np.cos(0.1), 0.9801], [1.0, 0.0, 0.81]])
def test_a_busy_signal_measures_what_is_predicted(a):
    """In 3 % of the noise power, 0.13 dB, as the source of the closed forms asks for, or in the interval."""
    realization = recursive(a)
    rms = norms_from_input(realization.program.diagram, nodes=realization.program.diagram.outputs).l2[0] / np.sqrt(3.0)
    x = white(10 * RATE, 1, 2, -20.0 * np.log10(5.0 * rms))
    measured = measure(realization, x, BAND)
    assert measured.white.holds, measured.white.reason
    assert measured.tally.saturations == 0
    allowed = max(0.13, measured.noise.interval_db)
    assert measured.noise.dbfs == pytest.approx(measured.prediction.dbfs, abs=allowed)
    assert measured.noise.a_dbfs == pytest.approx(measured.prediction.a_dbfs, abs=allowed)


def test_the_a_weighted_prediction_is_the_weighted_spectrum():
    """White noise of one rounding through no recursion: the integral of A over the band, on another grid."""
    filter = Filter.from_coefficients([0.3], rate=RATE)
    realization = realize(filter, form="direct-1", format=Fixed("Q1.15", coefficients=FINE))
    predicted = predicted_noise(realization.program, RATE)
    hertz = np.linspace(*BAND, 1_000_001)
    share = np.trapezoid(a_weighting(hertz), hertz) / 24000.0
    variance = 10.0 ** (predicted.full_dbfs / 10.0) / 2.0
    assert predicted.a_dbfs == pytest.approx(power_dbfs(variance * share), abs=1e-6)  # steps of 0.02 Hz
    assert predicted.dbfs == pytest.approx(power_dbfs(variance * 19980.0 / 24000.0), abs=1e-9)  # float64


def test_floor_adds_a_mean_and_no_noise():
    plain = recursive([1.0, -0.9])
    floored = realize(plain.filter, form="direct-1", format=Fixed("Q1.15", coefficients=FINE, rounding="floor"))
    assert predicted_noise(floored.program, RATE) == predicted_noise(plain.program, RATE)


def test_what_does_not_die_out_is_infinite():
    filter = design("high-pass", rate=RATE, frequency=28.0, q=0.707)  # 16 bits put a pole on z = 1
    predicted = predicted_noise(realize(filter, form="direct-1", format="16x16+40").program, RATE)
    assert predicted.dbfs == predicted.full_dbfs == predicted.a_dbfs == np.inf


def test_a_low_rate_has_no_band():
    filter = Filter.from_coefficients([1.0], [1.0, -0.5], rate=30.0)
    predicted = predicted_noise(realize(filter, form="direct-1", format=Fixed("Q1.15")).program, 30.0)
    assert predicted.dbfs is predicted.a_dbfs is None
    assert np.isfinite(predicted.full_dbfs)


@pytest.mark.parametrize("distance", [1e-1, 1e-4, 1e-8])
def test_integrals_see_every_resonance(distance):
    """The mean of 1/|1 - p z^-1|^2 is 1/(1 - |p|^2) wherever the pole lies."""
    pole = (1.0 - distance) * np.exp(1.3j)
    edges = breakpoints([pole, np.conj(pole)], 0.0, np.pi)

    def density(w):
        near, far = (1.0 / np.abs(np.exp(1j * w) - p) ** 2 for p in (pole, np.conj(pole)))
        return (near + far) / 2.0

    assert integral(density, edges) / np.pi == pytest.approx(1.0 / (1.0 - abs(pole) ** 2), rel=1e-7)


def test_refined_keeps_the_edges():
    assert refined(np.array([0.0, 1.0, 4.0]), 3) == pytest.approx([0, 1 / 3, 2 / 3, 1, 2, 3, 4], rel=1e-15)
