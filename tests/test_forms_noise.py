"""Predicted noise is measured in the forms whose roundings the white model describes."""

import pytest

from streamhost import Fixed, design, realize
from streamhost.measure import measure
from streamhost.signals import white

RATE = 48000


@pytest.mark.slow
@pytest.mark.parametrize("form", ["coupled", "lattice-normalized"])
def test_predicted_noise_is_measured(form: str) -> None:
    """Within 0.5 dB or the measurement's own 95 % interval, as everywhere."""
    filter = design("low-pass", rate=RATE, frequency=1000, q=0.707)
    realization = realize(filter, form=form, format=Fixed("Q1.15", coefficients={"bits": 32}))
    # 10 dB down: white noise then stays five times its rms below the largest node's full scale
    measured = measure(realization, white(3 * RATE, 1, 3, -10.0), (20.0, 20000.0))
    assert measured.white.holds and measured.noise.dbfs is not None
    assert measured.noise.dbfs == pytest.approx(measured.prediction.dbfs, abs=max(0.5, measured.noise.interval_db))
