"""Wherever the white model holds, predicted noise is within 0.5 dB of measured, or in its interval."""

import numpy as np
import pytest

from streamhost import Filter, Fixed, realize
from streamhost.diagram.norms import norms_from_input
from streamhost.measure import measure
from streamhost.signals import white

RATE = 48000
FORMS = ("direct-1", "direct-2", "transposed-2", "direct-1-swapped", "transposed-1")
SEEDS = range(20)


def random_filter(seed):
    """Orders 1 to 8; poles from 0.3 to 0.995, more of them near the circle; zeros anywhere around it."""
    rng = np.random.default_rng(seed)
    order = 1 + seed % 8
    poles, zeros = [], []
    for _ in range(order // 2):
        pole = (1.0 - 10.0 ** rng.uniform(-2.3, -0.15)) * np.exp(1j * rng.uniform(0.02, 3.1))
        zero = rng.uniform(0.3, 1.1) * np.exp(1j * rng.uniform(0.02, 3.1))
        poles += [pole, np.conj(pole)]
        zeros += [zero, np.conj(zero)]
    if order % 2:
        poles.append(rng.uniform(-0.95, 0.95))
        zeros.append(rng.uniform(-1.0, 1.0))
    return Filter.from_zeros_poles(zeros, poles, 1.0, rate=RATE)


def realization_of(seed, bits):
    format = Fixed(f"Q1.{bits - 1}", coefficients={"bits": 32})
    return realize(random_filter(seed), form=FORMS[seed % 5], scaling="l2", format=format)


def headroom_db(realization):
    """The peak of white noise that leaves every value five times its rms."""
    largest = norms_from_input(realization.program.diagram).l2.max() / np.sqrt(3.0)
    return -20.0 * np.log10(max(1.0, 5.0 * largest))


@pytest.mark.slow
@pytest.mark.parametrize("bits", [16, 24])
def test_predicted_noise_is_measured_wherever_the_white_model_holds(bits):
    held = 0
    for seed in SEEDS:
        realization = realization_of(seed, bits)
        measured = measure(realization, white(5 * RATE, 1, seed, headroom_db(realization)), (20.0, 20000.0))
        if not measured.white.holds or measured.noise.dbfs is None:
            continue
        held += 1
        allowed = max(0.5, measured.noise.interval_db)
        assert measured.noise.dbfs == pytest.approx(measured.prediction.dbfs, abs=allowed), f"seed {seed}"
    # 16 bits are coarse for some of these filters, which the verdict says; were it to say so of most, this would be no test
    assert held >= {16: 12, 24: 19}[bits]
