"""The order of sections with the least predicted noise, and scaling by L1, peaks and powers of two."""

import math
from fractions import Fraction
from functools import cache
from itertools import permutations

import numpy as np
import pytest
from band_pass import noise_gain
from form_filters import DIRECT, NUMERATOR_FIRST
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import signal

from streamhost import Filter, Fixed, design, realize
from streamhost.errors import StructureError
from streamhost.formats import named_format
from streamhost.measure.predicted import predicted_noise
from streamhost.program.run import lower, run_definition
from streamhost.structures import build
from streamhost.structures.norm import l2_norm
from streamhost.structures.quadrature import sampled
from streamhost.structures.quietest import BETTER, MOST_EXACT

RATE = 48000


def hz(name: str, order: int, *edges: float, response: str = "band-pass") -> Filter:
    frequency = edges if len(edges) > 1 else edges[0]
    more = {"ripple_db": 0.5, "stopband_db": 50} if name == "elliptic" else {}
    return design(name, rate=RATE, response=response, order=order, frequency=frequency, **more)




@cache
def noise(filter: Filter, form: str, scaling: str, order: tuple[int, ...] | None) -> float:
    """Predicted noise of a realization in 24 bits with fine coefficients, in dB; None: ordered quietest."""
    format = Fixed("Q1.23", coefficients={"bits": 32})
    if order is None:
        realization = realize(filter, form=form, ordering="quietest", scaling=scaling, format=format)
    else:
        rows = [[*section.b, *section.a] for section in build(filter, form=form).sections]
        given = Filter.from_sections([rows[k] for k in order], rate=RATE)
        realization = realize(given, form=form, scaling=scaling, format=format)
    return predicted_noise(realization.program, RATE).full_dbfs


@pytest.mark.parametrize("form", ["direct-1", "direct-2", "transposed-2"])
@pytest.mark.parametrize("scaling", ["none", "l2", "linf-shift"])
def test_no_order_is_predicted_quieter_by_the_program_itself(form: str, scaling: str) -> None:
    """The model has one error a section, the program all of its roundings: forms of more roundings may differ a little."""
    filter = hz("elliptic", 3, 2000, 5000)
    chosen = noise(filter, form, scaling, None)
    others = [noise(filter, form, scaling, order) for order in permutations(range(3))]
    assert chosen <= min(others) + {"direct-1": 0.1, "direct-2": 0.3, "transposed-2": 0.3}[form]
    assert max(others) > min(others) + 1.0


@given(st.integers(1, MOST_EXACT), st.integers(0, 100))
@settings(max_examples=20)
def test_quadrature_is_the_exact_norm(count: int, seed: int) -> None:
    """Of one section by the closed norm, and of a weighted sum over all by its parts."""
    rng = np.random.default_rng(seed)
    radius, angle = 1.0 - 10.0 ** rng.uniform(-6, -0.3), rng.uniform(0.0, math.pi)
    section = [1.0, rng.uniform(-2, 2), rng.uniform(-1, 1), 1.0, -2 * radius * math.cos(angle), radius**2]
    built = build(Filter.from_sections([section] * count, rate=RATE), form="direct-1").sections
    samples = sampled(built)
    exact = l2_norm(*(tuple(map(Fraction, values)) for values in (built[0].b, built[0].a)))
    # The exact norm is kept to 24 bits.
    assert math.sqrt(samples.power(samples.whole[0])) == pytest.approx(exact, rel=2.0**-23)
    assert float(samples.weights.sum()) == pytest.approx(1.0, abs=1e-13)


def test_more_sections_than_are_searched_exactly_are_at_least_as_quiet_as_both_rules() -> None:
    filter = hz("butterworth", MOST_EXACT + 1, 3000, 6000)
    levels = {how: noise_gain(build(filter, form="direct-1", ordering=how, scaling="l2").sections)
              for how in ("quietest", "outward", "inward")}
    assert levels["quietest"] <= min(levels["outward"], levels["inward"])
    assert levels["quietest"] < max(levels["outward"], levels["inward"]) - 0.1


def test_equal_sections_stay_in_their_order() -> None:
    rows = [[1.0, 0.5, 0.25, 1.0, -0.5, 0.25], [1.0, 0.5, 0.25, 1.0, -0.5, 0.25]]
    filter = Filter.from_sections(rows, rate=RATE)
    assert build(filter, form="direct-1", ordering="quietest").sections == build(filter, form="direct-1").sections
    assert BETTER < 1.0


@pytest.mark.parametrize("norm", ["l1", "linf"])
@pytest.mark.parametrize("form", DIRECT)
def test_scaled_points_have_that_norm(norm: str, form: str) -> None:
    """By scipy's responses of the sections as drawn: 4,000 frames, after which these filters are over."""
    built = build(hz("elliptic", 4, 3000, 6000), form=form, scaling=norm)
    h = np.eye(1, 4000)[0] * (built.front or 1.0)
    points = built.sections[:-1] if form in NUMERATOR_FIRST else built.sections
    for section in points:
        recursive, h = signal.lfilter([1.0], section.a, h), signal.lfilter(section.b, section.a, h)
        point = h if form in NUMERATOR_FIRST else recursive
        size = np.abs(point).sum() if norm == "l1" else np.abs(np.fft.rfft(point, 1 << 18)).max()
        # Norms are rounded to 24 bits, and a peak is found on a grid to 1e-6.
        assert size == pytest.approx(1.0, rel=2e-6)


@pytest.mark.parametrize("form", DIRECT)
@pytest.mark.parametrize("norm", ["l1", "l2", "linf"])
def test_powers_of_two_bring_each_point_nearest_to_1_and_leave_the_sections(form: str, norm: str) -> None:
    filter = hz("elliptic", 4, 3000, 6000)
    built, plain = build(filter, form=form, scaling=f"{norm}-shift"), build(filter, form=form)
    assert built.sections == plain.sections and built.front is None
    x = np.random.default_rng(3).uniform(-1, 1, (200, 1))
    first, second = (run_definition(lower(each.diagram, named_format("float64")), x) for each in (built, plain))
    np.testing.assert_array_equal(first, second)  # powers of two change no bit of float64
    shifts = [node.k for node in built.diagram.nodes if node.kind == "shift"]
    assert shifts and sum(shifts) == 0
    level = 1.0
    h = np.eye(1, 4000)[0]
    ratios = []
    for k, section in enumerate(built.sections):
        level *= 2.0 ** next((node.k for node in built.diagram.nodes if node.label == f"scale_{k + 1}"), 0)
        recursive, h = signal.lfilter([1.0], section.a, h), signal.lfilter(section.b, section.a, h)
        point = level * (h if form in NUMERATOR_FIRST else recursive)
        size = {"l1": np.abs(point).sum(), "l2": np.sqrt((point**2).sum()),
                "linf": np.abs(np.fft.rfft(point, 1 << 18)).max()}[norm]
        ratios.append(size)
    points = ratios[:-1] if form in NUMERATOR_FIRST else ratios
    assert all(2.0**-0.5 * 0.999 <= ratio <= 2.0**0.5 * 1.001 for ratio in points)


def test_a_pole_on_the_circle_has_no_quietest_order() -> None:
    rows = [[1.0, 0.5, 0.0, 1.0, -1.0, 0.0], [1.0, 0.5, 0.0, 1.0, 0.5, 0.0]]
    with pytest.raises(StructureError, match=r'"quietest" weighs.*Allowed for it are "outward" and "inward"'):
        build(Filter.from_sections(rows, rate=RATE), form="direct-1", ordering="quietest")
