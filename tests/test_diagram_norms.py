"""Norms between the input, the nodes and the output, held against closed forms, tables and direct runs."""

from collections.abc import Callable
from fractions import Fraction
from math import ceil, inf, log, log2, sqrt

import numpy as np
import pytest
from diagram_evaluator import evaluate
from diagram_examples import (
    comb,
    cookbook_low_pass,
    coupled,
    direct_1,
    direct_2,
    fir,
    node,
    running_sum,
    second_order,
    transposed_2,
)
from error_norms import noise_gains, norms_to_output
from hypothesis import given
from random_diagrams import diagrams

from streamhost.diagram import Builder, Diagram, minus
from streamhost.diagram.norms import (
    Norms,
    norms_from_input,
    power_response,
    powers_from_input,
    responses_from_input,
    settling_frames,
)


def output_norms(diagram: Diagram) -> tuple[float, float, float]:
    """l1, l2 and peak of the first output's response."""
    norms = norms_from_input(diagram, nodes=diagram.outputs[:1])
    return norms.l1.item(), norms.l2.item(), norms.peak.item()


# --- closed forms and tables


@pytest.mark.parametrize(("a", "gain", "growth"), [
    (0.5, 1.333333, 2.0), (0.9, 5.263158, 10.0), (0.95, 10.25641, 20.0), (0.99, 50.251256, 100.0),
    (0.999, 500.250125, 1000.0),
])
def test_first_order_section(a: float, gain: float, growth: float) -> None:
    # Gold & Rader 1966 (AFIPS); Oppenheim & Schafer 6.9; Jackson 1970; from memory: 1/(1-a^2) and 1/(1-|a|).
    l1, l2, peak = output_norms(direct_1([1.0], [1.0, -a]))
    assert l2**2 == pytest.approx(gain, abs=5e-7)  # printed to six decimals
    assert l2**2 == pytest.approx(1.0 / (1.0 - a**2), rel=1e-12)
    assert l1 == pytest.approx(growth, rel=1e-9)
    assert peak == pytest.approx(growth, rel=1e-9)


@pytest.mark.parametrize(("r", "angle", "gain", "l1", "peak"), [
    (0.9, 0.785398163, 5.7523, 8.964, 7.443), (0.99, 0.785398163, 50.7512, 85.782, 71.066),
    (0.99, 0.1, 2520.9973, 639.72, 503.351), (0.99, 0.130899694, 1480.9521, 488.977, 384.99),
])
@pytest.mark.parametrize("form", [direct_1, direct_2, transposed_2])
def test_second_order_section(form: Callable[..., Diagram], r: float, angle: float, gain: float, l1: float,
                              peak: float) -> None:
    # Jackson 1970 (Bell System Technical Journal 49); Oppenheim & Schafer 6.9; from memory, to the digits printed.
    found = output_norms(form([1.0, 0.0, 0.0], second_order(r, angle)))
    assert found[1] ** 2 == pytest.approx(gain, abs=5e-5)
    assert found[1] ** 2 == pytest.approx(
        (1 + r**2) / (1 - r**2) / (1 + r**4 - 2 * r**2 * np.cos(2 * angle)), rel=1e-9)
    assert found[0] == pytest.approx(l1, abs=5e-4)
    assert found[2] == pytest.approx(peak, abs=5e-4)
    # |1/A| is largest where cos w = (1 + r^2)/(2 r) cos(angle), and is 1/((1 - r^2) sin(angle)) there.
    assert found[2] == pytest.approx(1.0 / ((1.0 - r**2) * np.sin(angle)), rel=1e-6)


@pytest.mark.parametrize("angle", [0.02, 0.1, 0.785398163, 2.5])
def test_coupled_form_has_the_same_noise_at_every_angle(angle: float) -> None:
    # Rader & Gold 1967, from memory: sources at u and v, together 2/(1-r^2) at the states; 100.5025 for r = 0.99.
    diagram = coupled(0.99, angle)
    u, v = node(diagram, "u"), node(diagram, "v")
    seen = noise_gains(diagram, [u, v])  # at v alone, where u's and v's errors arrive as a sine and a cosine
    assert seen.sum() == pytest.approx(1.0 / (1.0 - 0.99**2), rel=1e-9)
    assert 2 * seen.sum() == pytest.approx(100.5025, abs=5e-5)


@pytest.mark.parametrize(("frequency", "pole_l2", "pole_peak", "pole_l1", "bits", "l1", "power"), [
    (20.0, 4447.1167, 146172.683, 159376.719, 17.282, 1.09033, 0.0009256),
    (100.0, 400.7185, 5890.202, 6422.333, 12.649, 1.09034, 0.00462787),
    (1000.0, 13.7728, 63.839, 69.667, 6.122, 1.09087, 0.04616473),
])
def test_low_pass_as_direct_2(frequency: float, pole_l2: float, pole_peak: float, pole_l1: float, bits: float,
                              l1: float, power: float) -> None:
    # Computed for this project by sum of h^2, closed form and frequency grid (coefficients: Audio EQ Cookbook).
    # With poles 0.0019 from z = 1 the coefficients' rounding moves these by 1e-16 / 0.0019^2 = 3e-11: digits printed.
    diagram = direct_2(*cookbook_low_pass(frequency))
    norms = norms_from_input(diagram, nodes=[node(diagram, "w"), diagram.outputs[0]])
    assert norms.l2[0] == pytest.approx(pole_l2, abs=5e-5)
    assert norms.peak[0] == pytest.approx(pole_peak, abs=5e-4)
    assert norms.l1[0] == pytest.approx(pole_l1, abs=5e-4)
    assert log2(norms.l1[0]) == pytest.approx(bits, abs=5e-4)
    assert norms.l1[1] == pytest.approx(l1, abs=5e-6)
    assert norms.l2[1] ** 2 == pytest.approx(power, abs=5e-8 if frequency < 50 else 5e-9)
    assert norms.peak[1] == pytest.approx(1.0, rel=1e-9)


@pytest.mark.parametrize("length", [8, 64, 1024])
def test_moving_average(length: int) -> None:
    # From memory: the white-noise gain of an M-point average is 1/M; its largest gain is 1, at 0 Hz.
    for diagram in (fir(np.full(length, 1.0 / length)), running_sum(length, 1.0 / length)):
        l1, l2, peak = output_norms(diagram)
        assert (l1, l2**2, peak) == pytest.approx((1.0, 1.0 / length, 1.0), rel=1e-12)


@pytest.mark.parametrize("angle", [0.0026, 0.1, 1.5])
def test_poles_at_a_distance_of_1e_7_from_the_circle(angle: float) -> None:
    a = second_order(1.0 - 1e-7, angle)
    a1, a2 = Fraction(a[1]), Fraction(a[2])
    gain = float((1 + a2) / ((1 - a2) * ((1 + a2) ** 2 - a1**2)))  # the closed form, exact on the coefficients
    for form in (direct_1, direct_2, transposed_2):
        # A relative 1e-16 in A moves the pole by 1e-16 / angle: up to 4e-14 of 1e-7; thirty squarings of A each add it.
        found = norms_from_input(form([1.0, 0.0, 0.0], a), nodes=[-1])
        assert found.l2.item() ** 2 == pytest.approx(gain, rel=1e-4 if angle < 0.01 else 1e-6)
        # L1 of r^k sin((k + 1) angle) / sin(angle): 2/pi of the envelope's sum where 1 - r is far below the angle.
        l1 = 2 / np.pi * 1e7 / np.sin(angle)
        assert l1 * (1 - 1e-3) <= found.l1.item() <= l1 * 1.12
        assert found.l1.item() - found.l1_slack.item() <= l1
        assert found.peak.item() == pytest.approx(1e7 / (2 * np.sin(angle)), rel=1e-4)


def test_one_real_pole_at_a_distance_of_1e_7() -> None:
    l1, l2, peak = output_norms(direct_1([1.0], [1.0, -(1.0 - 1e-7)]))
    assert l2**2 == pytest.approx(1.0 / (1.0 - (1.0 - 1e-7) ** 2), rel=1e-8)  # thirty squarings, each 1e-16 of 1e-7
    assert l1 == pytest.approx(1e7, rel=1e-8)
    assert peak == pytest.approx(1e7, rel=1e-8)


# --- laws


@given(diagrams())
def test_norms_of_random_diagrams_are_those_of_their_responses(diagram: Diagram) -> None:
    norms = norms_from_input(diagram)
    h = responses_from_input(diagram, frames=4096)  # poles lie within 0.98
    spectrum = np.abs(np.fft.rfft(h, n=1 << 14, axis=0)).max(axis=0)
    size = np.abs(h).max()
    np.testing.assert_allclose(norms.l2, np.sqrt((h**2).sum(axis=0)), rtol=1e-9, atol=1e-12 * size)
    np.testing.assert_allclose(norms.l1, np.abs(h).sum(axis=0), rtol=1e-8, atol=1e-10 * size)
    # The grid of 2^14 points may miss the top of a peak; it can never exceed it.
    assert (spectrum <= norms.peak * (1 + 1e-9) + 1e-10 * size).all()
    np.testing.assert_allclose(norms.peak, spectrum, rtol=1e-3, atol=1e-10 * size)
    np.testing.assert_allclose(powers_from_input(diagram), norms.l2**2, rtol=1e-12)


@given(diagrams())
def test_l2_is_at_most_the_peak_and_the_peak_at_most_l1(diagram: Diagram) -> None:
    # Jackson 1970; equality for a single tap, hence the margin for rounding.
    norms = norms_from_input(diagram)
    # A node that all but cancels, or has a gain of 1e-6 a few times, sees the rounding of the larger values behind it.
    margin = 1e-13 * norms.l1.max()
    assert (norms.l2 <= norms.peak * (1 + 1e-9) + margin).all()
    assert (norms.peak <= norms.l1 * (1 + 1e-9) + margin).all()


@given(diagrams())
def test_an_error_at_the_input_is_an_input(diagram: Diagram) -> None:
    there = norms_from_input(diagram, nodes=diagram.outputs)
    for i in range(len(diagram.outputs)):
        back = norms_to_output(diagram, [diagram.inputs[0]], output=i)
        for name in ("l1", "l2", "peak"):
            # One pass runs A, the other its transpose: rounding differs.
            assert getattr(back, name)[0] == pytest.approx(getattr(there, name)[i], rel=1e-7, abs=1e-9)


@pytest.mark.parametrize("form", [direct_1, direct_2, transposed_2])
def test_worst_input_reaches_l1_and_a_sine_at_the_resonance_the_peak(form: Callable[..., Diagram]) -> None:
    diagram = form([0.2, 0.3, -0.1], second_order(0.9, 1.0))
    norms = norms_from_input(diagram)
    frames = 400  # 0.9^400 = 5e-19 of what came before is left
    h = responses_from_input(diagram, frames=frames)
    w = np.linspace(0.0, np.pi, 200001)
    for index in range(len(diagram.nodes)):
        worst = evaluate(diagram, np.sign(h[::-1, index]))[-1, index]
        assert worst == pytest.approx(norms.l1[index], rel=1e-9)
        spectrum = np.exp(-1j * np.outer(w[::100], np.arange(frames))) @ h[:, index]
        top = w[::100][np.abs(spectrum).argmax()]
        sine = evaluate(diagram, np.cos(top * np.arange(4 * frames)))[frames:, index]
        # On a grid of pi/2000 the top of a peak 0.2 wide is missed by up to (pi/4000 / 0.1)^2 / 2 = 3e-5, and the
        # sine's own samples miss its crest by less than 1e-4.
        assert np.abs(sine).max() == pytest.approx(norms.peak[index], rel=2e-4)


@given(diagrams())
def test_mean_of_the_power_response_is_the_noise_gain(diagram: Diagram) -> None:
    sources = list(range(len(diagram.nodes)))
    # The mean over 2048 points is exact but for what wraps round, responses longer than that: 0.98^2048 = 1e-18.
    power = power_response(diagram, sources, 2.0 * np.pi * np.arange(2048) / 2048)
    gains = noise_gains(diagram, sources)
    np.testing.assert_allclose(power.mean(axis=0), gains, rtol=1e-8, atol=1e-12 * gains.max())


def test_power_response_at_20_hz_of_poles_near_one() -> None:
    b, a = cookbook_low_pass(20.0)
    diagram = direct_1(b, a)
    w = 2.0 * np.pi * np.array([1.0, 20.0, 1000.0]) / 48000.0
    found = power_response(diagram, [node(diagram, "y")], w)[:, 0]
    # 1/|A|^2 on the coefficients as stored: A(z) = 1 + a1 + a2 - (a1 + 2 a2) d + a2 d^2 with d = 1 - z^-1, sums exact.
    c0, c1, c2 = float(1 + Fraction(a[1]) + Fraction(a[2])), float(-Fraction(a[1]) - 2 * Fraction(a[2])), a[2]
    d = -np.expm1(-1j * w)
    np.testing.assert_allclose(found, 1.0 / np.abs(c0 + c1 * d + c2 * d**2) ** 2, rtol=1e-9)


def test_long_fir_goes_by_its_impulse_response() -> None:
    h = np.random.default_rng(1).normal(size=1000)
    l1, l2, peak = output_norms(fir(h))
    assert l1 == pytest.approx(np.abs(h).sum(), rel=1e-12)
    assert l2 == pytest.approx(sqrt((h**2).sum()), rel=1e-12)
    grid = np.abs(np.fft.rfft(h, 1 << 17)).max()  # 128 points a lobe: within (pi/128)^2 / 2 = 3e-4
    assert grid <= peak * (1 + 1e-12)
    assert peak == pytest.approx(grid, rel=3e-4)


# --- what never dies


def test_pole_on_the_circle_or_outside_is_infinite_and_never_nan() -> None:
    for a in ([1.0, -1.0], [1.0, 1.0], [1.0, -1.1], second_order(1.0, 0.3), second_order(1.2, 0.3), [1.0, -2.0, 1.0]):
        diagram = direct_1([1.0], a)
        assert output_norms(diagram) == (inf, inf, inf)
        y = node(diagram, "y")
        assert noise_gains(diagram, [y]).tolist() == [inf]
        assert power_response(diagram, [y], [0.0, 0.3, 1.0]).tolist() == [[inf]] * 3
        assert settling_frames(diagram) == inf


def test_running_sum_is_finite_from_its_input_and_infinite_from_its_own_register() -> None:
    diagram = running_sum(64)
    x, y = diagram.inputs[0], node(diagram, "y")
    assert norms_from_input(diagram, nodes=[y]).l1.tolist() == [64.0]
    norms = norms_to_output(diagram, [x, y])
    assert norms.l1.tolist() == [64.0, inf]
    assert norms.l2.tolist() == [8.0, inf]
    assert norms.peak[0] == pytest.approx(64.0, rel=1e-12)
    assert norms.peak[1] == inf


def with_unstable_branch() -> Diagram:
    b = Builder()
    x, d, s = b.input(), b.delay("d"), b.delay("s")
    stable = b.sum(x, b.gain(s, "g", 0.5), label="stable")
    s.takes(stable)
    growing = b.sum(stable, b.gain(d, "a", 1.5), label="growing")
    d.takes(growing)
    b.output(stable, "first")
    b.output(growing, "second")
    return b.build()


def test_growth_is_decided_node_by_node() -> None:
    diagram = with_unstable_branch()
    norms = norms_from_input(diagram)
    finite = [n.label for i, n in enumerate(diagram.nodes) if np.isfinite(norms.l2[i])]
    assert finite == ["x", "s", "g", "stable", "first"]
    assert norms.l1[node(diagram, "stable")] == pytest.approx(2.0, rel=1e-9)
    stable, growing = node(diagram, "stable"), node(diagram, "growing")
    assert norms_to_output(diagram, [stable, growing], output=0).l1.tolist() == pytest.approx([2.0, 0.0], rel=1e-9)
    assert norms_to_output(diagram, [stable, growing], output=1).l1.tolist() == [inf, inf]


def test_pole_on_the_circle_that_a_zero_hides_is_finite() -> None:
    # An integrator, then its difference (a first-order section between them, so that nothing ends): 1/(1 - 0.5 z^-1).
    b = Builder()
    x, i1, s1 = b.input(), b.delay("i1"), b.delay("s1")
    i = b.sum(x, i1, label="i")
    i1.takes(i)
    s = b.sum(i, b.gain(s1, "g", 0.5), label="s")
    s1.takes(s)
    b.output(b.sum(s, minus(s1), label="difference"))
    norms = norms_from_input(b.build(), nodes=[i.index, s.index, -1])
    assert norms.l2[:2].tolist() == [inf, inf]
    assert norms.l2[2] ** 2 == pytest.approx(1.0 / (1.0 - 0.25), rel=1e-9)
    assert norms.peak[2] == pytest.approx(2.0, rel=1e-6)


@pytest.mark.parametrize("frames", [7, 70, 300])
def test_long_delay_in_a_loop(frames: int) -> None:
    # h is 1, g, g^2, ... every so many frames.
    norms: Norms = norms_from_input(comb(frames, 0.5), nodes=[-1])
    assert norms.l2.item() ** 2 == pytest.approx(1.0 / (1.0 - 0.25), rel=1e-9)
    assert norms.l1.item() == pytest.approx(2.0, rel=1e-9)
    assert norms.peak.item() == pytest.approx(2.0, rel=1e-6)


def test_long_unstable_loop_is_infinite() -> None:
    norms = norms_from_input(comb(300, 1.5), nodes=[-1])
    assert (norms.l1.item(), norms.l2.item(), norms.peak.item()) == (inf, inf, inf)


# --- settling


@pytest.mark.parametrize("a", [0.9, 0.99, -0.999, 0.99999])
def test_settling_of_a_first_order_section(a: float) -> None:
    # What is left at frame n is a^(2n) of the total.
    assert settling_frames(direct_1([1.0], [1.0, -a])) == ceil(-12.0 * log(10.0) / (2.0 * log(abs(a))))


def test_settling_is_at_least_64_frames_and_that_of_the_slowest_output() -> None:
    assert settling_frames(fir([1.0, 2.0])) == 64
    assert settling_frames(fir(np.ones(200))) == 200
    b = Builder()
    x = b.input()
    b.output(x, "now")
    b.output(b.delay("d", x, 100), "late")
    diagram = b.build()
    assert settling_frames(diagram) == 101
    assert settling_frames(diagram, nodes=diagram.outputs[:1]) == 64
