"""The noise figures in the explanations of the forms are those of their diagrams."""

import pytest
from noise_figures import noise_gain_db, stated

FORMS = (
    "coupled", "lattice-ladder", "lattice-normalized", "lattice-one-multiplier", "state-variable", "state-variable-delayed",
)


@pytest.mark.parametrize("figure", [("low-pass", 100.0), ("low-pass", 1000.0)])
@pytest.mark.parametrize("name", FORMS)
def test_the_explanations_noise_figures(name: str, figure: tuple[str, float]) -> None:
    assert stated(name, f"{noise_gain_db(name, *figure):.1f}")
    assert stated(name, f"{noise_gain_db('direct-1', *figure):.1f}")


def test_the_ladders_high_pass_figure() -> None:
    assert stated("lattice-ladder", f"{noise_gain_db('lattice-ladder', 'high-pass', 100.0):.1f}")
