"""Every form's state space, put into python-control: its poles, its response, and the invariants of its second-order modes."""

import control
import numpy as np
import pytest
from form_filters import RATE, built, carried, filters

from streamhost import design, realize
from streamhost.structures import forms

FREQUENCIES = np.array([50.0, 300.0, 1000.0, 4000.0, 15000.0])


def system(diagram) -> control.StateSpace:
    matrices = diagram.state_space()
    return control.ss(matrices.A, matrices.B, matrices.C, matrices.D, dt=1.0 / RATE)


@pytest.mark.parametrize("form", sorted(forms()))
def test_poles_and_response_are_those_of_the_filter(form: str) -> None:
    """Of the first filter with recursion that a form carries, else of the first at all. A double pole is known to the root
    of the rounding; the response to 1e-9 of its largest, where cancelled poles on the circle are no nearer than 50 Hz."""
    pool = [name for name in carried(form, "whole") if name not in ("constant", "one pole")]
    name = next((name for name in pool if any(filters()[name].zeros_poles().poles)), pool[0])
    diagram, filter = built(form, "whole", name).diagram, filters()[name]
    space = system(diagram)
    response = space(np.exp(2j * np.pi * FREQUENCIES / RATE), squeeze=True)
    np.testing.assert_allclose(response if response.ndim == 1 else response[0], filter.response(FREQUENCIES), rtol=0, atol=1e-9)
    poles = control.poles(space)
    for pole in filter.zeros_poles().poles:
        assert np.abs(poles - pole).min() < 1e-6


@pytest.mark.parametrize("frequency", [1000.0, 100.0])
def test_second_order_modes_are_invariant(frequency: float) -> None:
    """(sqrt(3) +- 1) / 4 for a low-pass of Q = 1/sqrt(2), whatever its cut-off and its form: Mullis & Roberts, IEEE ASSP-24,
    December 1976 (from memory; recomputed). The Gramians are python-control's; those of 100 Hz lose some digits."""
    filter = design("low-pass", rate=RATE, frequency=frequency, q=2**-0.5)
    for form in ("minimum-noise", "normal", "coupled", "direct-2", "transposed-2", "state-variable", "lattice-normalized"):
        space = system(realize(filter, form=form, decomposition="whole").diagram)
        across = control.dlyap(space.A, space.B @ space.B.T) @ control.dlyap(space.A.T, space.C.T @ space.C)
        modes = np.sort(np.sqrt(np.linalg.eigvals(across).real))[-2:]
        np.testing.assert_allclose(modes, [(3**0.5 - 1) / 4, (3**0.5 + 1) / 4], rtol=1e-5, err_msg=form)
