"""Theory and measurement on the presets that ship: they agree wherever the white model is said to hold."""

import pytest

from streamhost.measure import limit_band, limit_signal, measure
from streamhost.presets import load_preset
from streamhost.presets.realizing import realize_preset
from streamhost.shipped import names


@pytest.fixture(scope="module")
def found():
    """Every shipped preset on the busy noise by which limits are checked: white, peak -20 dBFS, seed 1."""
    presets = {name: load_preset(name) for name in names("preset")}
    return {
        name: measure(realize_preset(preset), limit_signal(preset.rate), limit_band(preset.limits, preset.rate))
        for name, preset in presets.items()
    }


def test_prediction_and_measurement_agree_where_the_white_model_holds(found):
    """Within half a dB, or within the interval, which one signal in twenty leaves by chance; this one does not."""
    holding = {name: one for name, one in found.items() if one.white.holds}
    assert len(holding) >= 2
    for name, one in holding.items():
        assert one.noise.dbfs == pytest.approx(one.prediction.dbfs, abs=max(0.5, one.noise.interval_db)), name


def test_without_a_noise_figure_there_is_no_verdict(found):
    silent = [one for one in found.values() if one.noise.dbfs is None]
    assert silent
    assert all(one.white.holds is None and one.white.reason for one in silent)
