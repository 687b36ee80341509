"""The instrument `response`: delays, poles and zeros, stability, masks of standards."""

from fractions import Fraction

import numpy as np
import pytest

from streamhost import Filter, Fixed, design, load_preset, realize
from streamhost.commands.main import main
from streamhost.errors import PresetError, RequestError
from streamhost.filters.curves.band_mask import band_goals, band_limits, breakpoint_ratio
from streamhost.filters.curves.bands import exact_hz
from streamhost.filters.stability import roots_on_and_outside, step_down
from streamhost.measure import response

RATE = 48000
STORED = Fixed("Q1.15", coefficients="Q2.14")


def recursive(a, format="float64", **more):
    return realize(Filter.from_coefficients([1.0], a, rate=RATE), form="direct-1", decomposition="whole", format=format,
                   allow_unstable=True, **more)


# Stability


# Jury / Schur-Cohn criterion, polynomials expanded from their roots; reflection coefficients recomputed.
@pytest.mark.parametrize(("a", "verdict", "largest"), [
    ([1, -1.2, 0.07, 0.3, -0.08], "stable", 0.93912),  # |roots| 0.8 0.5 0.5 0.4; k = -0.93912, 0.33313, 0.20531, -0.08
    ([1, -1.3, -0.08, 0.24], "unstable", 1.09060),  # |roots| 1.2 0.5 0.4; k = -1.09060, 0.24618, 0.24
    ([1, -1.5, 1], "marginal", 1.0),  # a pair on the circle
    ([1, -1], "marginal", 1.0),  # an integrator
    ([1, -2.5, 1], "unstable", 1.0),  # 2 and 1/2: the reflection coefficient is 1 and nothing lies on the circle
])
def test_stable_marginal_and_unstable_are_told_apart(a, verdict, largest):
    found = response(recursive(a)).stability
    assert found.verdict == verdict
    assert found.largest_reflection == pytest.approx(largest, abs=5e-6)  # printed with five decimals


@pytest.mark.parametrize(("a", "on", "outside"), [
    ([1, -2.5, 2, -2.5, 1], 2, 1),  # 2, 1/2, j, -j
    ([1, -2, 1], 2, 0),  # twice 1
    ([1, 0, 0, 0, -1], 4, 0),  # the fourth roots of 1
    ([1, -3, 3, -1], 3, 0),
    ([1, -4, 4.75, -1.5], 0, 2),  # 2, 1.5 and 0.5, two of which are a reciprocal pair
    ([1, -0.5], 0, 0),
])
def test_which_roots_lie_on_the_circle_is_exact(a, on, outside):
    assert roots_on_and_outside(tuple(map(Fraction, a))) == (on, outside)


def test_the_lattice_test_gives_the_textbook_reflection_coefficients():
    # Step-down of the stable example above, recomputed: k1 to k4.
    stages = list(step_down(tuple(map(Fraction, [1.0, -1.2, 0.07, 0.3, -0.08]))))
    assert [float(stage[-1]) for stage in stages[::-1]] == pytest.approx([-0.93912, 0.33313, 0.20531, -0.08], abs=5e-6)


def test_a_running_sum_that_loses_nothing_is_stable():
    filter = Filter.from_coefficients([1 / 16] * 16, rate=RATE)
    found = response(realize(filter, form="running-sum", decomposition="whole", format=Fixed("Q1.15"))).stability
    assert (found.verdict, found.cancelled) == ("stable", 1)


# Poles and zeros


def test_kaisers_sensitivities():
    """dp/da_k = -p^(N-k) / prod(p - p_j) at p = 0.99 e^(j 0.05) (J. F. Kaiser, 1965); figures recomputed."""
    p = 0.99 * np.exp(0.05j)
    (pole,) = response(recursive([1.0, -2 * p.real, abs(p) ** 2])).poles
    steps = {step.coefficient: complex(step.derivative_real, step.derivative_imaginary) for step in pole.steps}
    assert steps["a1"] == pytest.approx(-0.5 + 9.991665j, abs=1e-6)  # as many decimals as are printed
    assert steps["a2"] == pytest.approx(10.105220j, abs=1e-6)


def test_kaisers_sensitivities_of_four_poles_against_the_formula():
    poles = [0.99 * np.exp(0.05j), 0.99 * np.exp(-0.05j), 0.97 * np.exp(0.08j), 0.97 * np.exp(-0.08j)]
    found = response(recursive(np.poly(poles).real)).poles
    for pole in found:
        p = complex(pole.stored_real, pole.stored_imaginary)
        others = np.prod([p - q for q in poles if abs(p - q) > 1e-6])
        for k, step in enumerate(pole.steps, 1):
            expected = -(p ** (4 - k)) / others
            # four poles so near together: eigenvalues in float64 are off by 1e-8 of the gaps
            assert complex(step.derivative_real, step.derivative_imaginary) == pytest.approx(expected, rel=1e-5)


def test_one_step_of_a_stored_coefficient_moves_the_pole_as_far_as_told():
    a1, a2 = -1.9, 0.9125  # a pair at radius 0.955
    step = 2.0**-14
    (pole,) = response(recursive([1.0, a1, a2], format=STORED)).poles
    stored = [round(a / step) * step for a in (a1, a2)]
    for k, each in enumerate(pole.steps):
        moved = list(stored)
        moved[k] += step
        root = max(np.roots([1.0, *moved]), key=lambda root: root.imag)
        distance = abs(root - complex(pole.stored_real, pole.stored_imaginary))
        assert each.step == step
        assert each.moves == pytest.approx(distance, rel=0.01)  # the second order is a step over the gap of 0.2
        assert each.moves_hz == pytest.approx(distance * RATE / (2 * np.pi), rel=0.01)


def test_poles_and_zeros_are_paired_with_what_was_asked():
    filter = design("elliptic", rate=RATE, response="low-pass", order=5, frequency=4000.0, ripple_db=0.5, stopband_db=60.0)
    found = response(realize(filter, form="transposed-2", format=Fixed("Q1.23", coefficients="Q2.14")))
    asked = filter.zeros_poles()
    for known, roots in ((asked.poles, found.poles), (asked.zeros, found.outputs[0].zeros)):
        upper = sorted((root for root in known if root.imag >= 0.0), key=np.angle)
        told = sorted((complex(root.asked_real, root.asked_imaginary) for root in roots), key=np.angle)
        assert told == pytest.approx(upper, abs=1e-12)
        for root in roots:
            apart = abs(complex(root.asked_real, root.asked_imaginary) - complex(root.stored_real, root.stored_imaginary))
            assert root.moved == apart < 0.01
    assert found.stability.largest_radius == max(root.radius for root in found.poles) < 1.0


def test_16_bit_coefficients_put_a_pole_of_the_low_pass_on_z_1():
    """20 Hz, Q = 0.7071, a in Q14: a1 = -32707, a2 = 16323, so that 1 + a1 + a2 = 0; computed by hand."""
    filter = design("low-pass", rate=RATE, frequency=20.0, q=2**-0.5)
    found = response(realize(filter, form="direct-1", format=Fixed("Q1.15", coefficients={"bits": 16, "point": "polynomial"})))
    assert found.stability.verdict == "marginal"
    assert found.poles[0].stored_real == 1.0
    assert found.deviation_db is None
    assert "not stable" in found.bands[0].reason


# Delays


def test_a_linear_phase_filter_delays_by_half_its_length():
    filter = Filter.from_coefficients(np.hanning(23)[1:-1], rate=RATE)
    (found,) = response(realize(filter, form="direct-1", format="float64")).outputs
    assert found.latency_frames == pytest.approx(10.0, abs=1e-12)  # symmetric about tap 10; float64
    assert found.latency_ms == pytest.approx(1000.0 * 10.0 / RATE, abs=1e-12)
    # a phase differenced over 1e-3 / 22 radians: 1e-15 over that
    assert (found.group_delay_least_frames, found.group_delay_most_frames) == pytest.approx((10.0, 10.0), abs=1e-6)
    assert found.onset_frames == 0


def test_a_delay_of_seven_frames_is_a_latency_of_seven():
    (found,) = response(realize(Filter.from_coefficients([0] * 7 + [1.0], rate=RATE), form="direct-1")).outputs
    assert found.onset_frames == 7
    assert found.latency_frames == 7.0


def test_the_delay_of_a_pole_is_the_closed_form():
    """Of 1 / (1 - a z^-1): sum n a^2n / sum a^2n = a^2 / (1 - a^2), and a / (1 - a) frames at 0 Hz."""
    a = 0.99
    (found,) = response(recursive([1.0, -a]), [(0.0, 24000.0)]).outputs
    assert found.latency_frames == pytest.approx(a**2 / (1 - a**2), rel=1e-9)  # the tail that is left out holds 1e-12
    assert found.stored_delay_frames[0] == pytest.approx(a / (1 - a), rel=1e-5)  # differenced over 1e-3 of the distance
    assert found.group_delay_most_frames == pytest.approx(a / (1 - a), rel=1e-5)


def test_a_known_change_of_delay_and_phase_is_read_back():
    """A pole asked at 0.9 and stored at 115/128 (Q2.7)."""
    filter = Filter.from_coefficients([1.0], [1.0, -0.9], rate=RATE)
    (found,) = response(realize(filter, form="direct-1", format=Fixed("Q4.12", coefficients="Q2.7")), [(0.0, 100.0)]).outputs
    stored = 115 / 128
    assert found.group_delay_deviation_frames == pytest.approx(0.9 / 0.1 - stored / (1 - stored), rel=1e-5)
    w = 2 * np.pi * 100.0 / RATE
    phases = [np.degrees(np.angle(1 / (1 - a * np.exp(-1j * w)))) for a in (0.9, stored)]
    assert found.phase_deviation_degrees == pytest.approx(abs(phases[0] - phases[1]), rel=1e-6)


# Bands and outputs


def test_each_band_and_the_sum_of_outputs_have_their_deviation():
    filter = design("linkwitz-riley", rate=RATE, order=4, frequency=1800.0)
    found = response(realize(filter, form="transposed-2", format=Fixed("Q1.15", coefficients="Q2.14")),
                     [(20.0, 1000.0), (1000.0, 20000.0)])
    names = [(band.output, band.low_hz) for band in found.bands]
    assert names == [("low", 20.0), ("high", 20.0), ("sum", 20.0), ("low", 1000.0), ("high", 1000.0), ("sum", 1000.0)]
    assert found.deviation_db == max(band.deviation_db for band in found.bands)
    assert [one.output for one in found.outputs] == ["low", "high"]


# Masks


# IEC 61260-1:2014, Table 1, class 1, as quoted; x, least and most attenuation in dB relative to the mid-band.
OCTAVE = [(0, -0.4, 0.4), (1 / 8, -0.4, 0.5), (1 / 4, -0.4, 0.7), (3 / 8, -0.4, 1.4), (1 / 2, 1.2, 5.3), (1, 16.6, np.inf),
          (2, 40.5, np.inf), (3, 60, np.inf), (4, 70, np.inf)]


@pytest.mark.parametrize("order", [pytest.param(1, marks=pytest.mark.slow), 2, 3, pytest.param(4, marks=pytest.mark.slow)])
def test_the_octave_mask_agrees_with_its_table(order):
    filter = design("octave-band", rate=RATE, frequency=1000.0, order=order)
    (found,) = response(realize(filter, form="transposed-2"), masks=["octave-class-1"], judged_only=True).masks
    hertz = 1000.0 * 10.0 ** (0.3 * np.array([x for x, _, _ in OCTAVE]))
    hertz = np.concatenate((hertz, 1e6 / hertz))
    attenuation = -20 * np.log10(np.abs(filter.response(hertz) / filter.response(1000.0)))
    table = np.array(OCTAVE * 2)
    at_table = np.minimum(attenuation - table[:, 1], table[:, 2] - attenuation).min()
    assert found.margin_db <= at_table + 1e-9
    assert (found.margin_db >= 0.0) == (at_table >= 0.0) == (order >= 3)
    assert found.nominal_hz == 1000.0


@pytest.mark.parametrize(("bands", "nominal"), [(1, 1000.0), (3, 2500.0)])
def test_the_mask_of_every_frequency_is_that_of_the_goals(bands, nominal):
    """Goals are at points of the same straight lines; at the edge of the band each side has its own."""
    edges = exact_hz(nominal) * breakpoint_ratio(0.5, bands) ** np.array([-1.0, 1.0])
    for goal in band_goals(nominal, bands, 3):
        lower, upper = band_limits(np.array([goal.hertz]), nominal, bands)
        at_edge = np.isclose(goal.hertz, edges, rtol=1e-12).any()
        if not (at_edge and goal.lower_db == -np.inf):
            assert lower[0] == pytest.approx(goal.lower_db, abs=1e-9)
        if not (at_edge and goal.lower_db > -np.inf):
            assert upper[0] == pytest.approx(goal.upper_db, abs=1e-9)


def test_a_third_octave_band_is_found_and_a_wrong_one_named():
    filter = design("third-octave-band", rate=RATE, frequency=2500.0, order=4)
    realization = realize(filter, form="transposed-2")
    (found,) = response(realization, masks=["third-octave-class-1"], judged_only=True).masks
    assert found.nominal_hz == 2500.0
    assert found.margin_db > 0.0
    (other,) = response(realization, masks=["third-octave-class-1"], mask_hz=2000.0, judged_only=True).masks
    assert other.margin_db < -10.0  # most of the band lies where 16.6 dB of attenuation are asked for


@pytest.mark.parametrize("name", ["a-weighting", "c-weighting"])
def test_a_gain_that_is_off_is_read_back_from_the_mask(name):
    """At 1 kHz class 1 allows 0.7 dB (IEC 61672-1:2013, Table 3), and a sound curve is there at 0 dB."""
    curve = design(name, rate=RATE)
    louder = Filter.cascade([curve, Filter.from_coefficients([10 ** (0.6 / 20)], rate=RATE)])
    good, loud = (response(realize(each, form="transposed-2"), masks=[f"{name}-class-1"], judged_only=True).masks[0]
                  for each in (curve, louder))
    assert good.margin_db == pytest.approx(0.7, abs=1e-9)
    assert good.margin_hz == loud.margin_hz == 1000.0
    assert loud.margin_db == pytest.approx(0.1, abs=1e-9)


def test_the_plain_bilinear_transform_of_a_keeps_class_1_at_48_khz():
    """-1.216 dB at 10 kHz, where -3 are allowed, -6.21 at 15.8 kHz, where -16 are; computed for this project."""
    realization = realize(design("a-weighting", rate=RATE, fit="bilinear"), form="transposed-2")
    (found,) = response(realization, masks=["a-weighting-class-1"], judged_only=True).masks
    assert found.margin_db > 0.0


def test_a_mask_that_there_is_not_is_refused():
    realization = realize(design("octave-band", rate=RATE, frequency=1000.0), form="transposed-2")
    with pytest.raises(RequestError, match='no mask "octave": octave-class-1, third-octave'):
        response(realization, masks=["octave"])
    with pytest.raises(RequestError, match=r"mask_hz = 1100 is not allowed: the nominal mid-bands .* are 16, 31\.5"):
        response(realization, masks=["octave-class-1"], mask_hz=1100.0)


# Limits


BAND = """
rate = 48000
[[filter]]
kind = "octave-band"
frequency = 1000.0
[format]
signal = "Q1.23"
coefficients = "{word}"
[limits]
"""


@pytest.fixture
def band(tmp_path):
    def write(limits, word="Q2.30"):
        path = tmp_path / "band.toml"
        path.write_text(BAND.format(word=word) + limits, encoding="utf-8")
        return str(path)

    return write


@pytest.mark.parametrize(("word", "status", "said"), [
    ("Q2.30", 0, "Meets its limit."),
    ("Q2.7", 1, "dB inside (octave-class-1 about 1000 Hz, nearest to its edge at "),
])
def test_a_mask_is_a_limit(word, status, said, band, capsys):
    assert main(["measure", band('mask = "octave-class-1"\nmask_hz = 1000', word), "--only", "response"]) == status
    assert said in capsys.readouterr().out


@pytest.mark.parametrize(("limits", "said"), [
    ('mask = "octave-class-2"', 'mask = "octave-class-2" is not known: octave-class-1, third-octave-class-1, '),
    ('mask = "octave-class-1"\nmask_hz = 1100', "mask_hz = 1100.0 is not allowed: the nominal mid-bands of octave-class-1"),
    ("mask_hz = 1000", "mask_hz = 1000.0 says of which band a mask is, and there is no mask."),
    ('mask = "a-weighting-class-1"\nmask_hz = 1000', "mask_hz = 1000.0 is not allowed: a-weighting-class-1 has no mid-band."),
])
def test_a_mask_in_a_preset_that_cannot_be_is_refused(limits, said, band):
    with pytest.raises(PresetError) as error:
        load_preset(band(limits))
    assert said in str(error.value)
