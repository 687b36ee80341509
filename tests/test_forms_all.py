"""What holds for every form over the filters that it carries, whatever it draws."""

import re
from cmath import rect
from time import process_time

import numpy as np
import pytest
from drawing_reader import faults_of_figure, page_of
from form_filters import RATE, built, carried, filters, rounding_bound
from native_runs import busy, run_native
from scipy import signal

from streamhost import Filter, Fixed
from streamhost.drawing import layout_of, svg
from streamhost.errors import StructureError
from streamhost.filters import Polynomials
from streamhost.formats import named_format
from streamhost.program.run import lower, run_definition
from streamhost.structures import build, form, forms

DECOMPOSITIONS = ("cascade", "whole")
CASES = [(name, how, which) for name in forms() for how in DECOMPOSITIONS for which in carried(name, how)]
ONE_EACH = [cases[len(cases) // 3] for name in forms() for cases in [[case for case in CASES if case[0] == name]]]
HEADINGS = ("Source:", "Counts:", "Good at:", "Fails:", "Carries:", "Arithmetic:")
LEAST_SCALE = 0.8  # subscripts of 5.6 pt; smaller ones are hard to read in print (common practice)
FRAMES = 160


def by_scipy(filter: Filter, x: np.ndarray) -> np.ndarray:
    """scipy's filters, one for each factor as it was given."""
    for factor in filter.factors:
        if isinstance(factor, Polynomials):
            x = signal.lfilter(factor.b, factor.a, x)
        else:
            at_origin = [0.0] * (len(factor.zeros) + factor.delay - len(factor.poles))
            x = signal.sosfilt(signal.zpk2sos(factor.zeros, [*factor.poles, *at_origin], factor.gain), x)
    return x


@pytest.mark.parametrize(("name", "how", "which"), CASES)
def test_in_float64_it_is_scipys_filter(name: str, how: str, which: str) -> None:
    x = np.random.default_rng(1).uniform(-1, 1, FRAMES)
    diagram = built(name, how, which).diagram
    bound = rounding_bound(diagram, FRAMES)
    # The definition: kernels have their own test below, and compiling one for each case would take minutes.
    y = run_definition(lower(diagram, named_format("float64")), x[:, np.newaxis])[:, 0, 0]
    np.testing.assert_allclose(y, by_scipy(filters()[which], x), rtol=0, atol=bound)


@pytest.mark.parametrize(("name", "how", "which"), ONE_EACH)
def test_kernels_are_the_definition(name: str, how: str, which: str) -> None:
    diagram, x = built(name, how, which).diagram, busy(FRAMES, 1, 5)
    for format in (Fixed("Q1.15", coefficients={"bits": 20}, allow_vanishing=True), named_format("float32")):
        program = lower(diagram, format)
        np.testing.assert_array_equal(run_native(program, x).y, run_definition(program, x))


@pytest.mark.parametrize(("name", "how", "which"), CASES[::3])
def test_the_drawing_is_the_diagram(name: str, how: str, which: str) -> None:
    diagram = built(name, how, which).diagram
    general = diagram.hints.general
    drawn = general.diagram if general is not None and general.always else diagram
    assert drawn.hints.places_for(drawn.nodes) is not None, "every node of a form has a place"
    text = svg(diagram)
    assert faults_of_figure(text, drawn) == []
    assert [label.symbol.id for label in layout_of(drawn).labels if label.hit] == []
    assert page_of(text).scale >= LEAST_SCALE


@pytest.mark.parametrize("name", forms())
def test_it_carries_something_and_says_what(name: str) -> None:
    assert carried(name, "cascade") or carried(name, "whole")
    docs = form(name).docs
    assert docs.startswith(f"{name}: ")
    assert [heading for heading in HEADINGS if not re.search(rf"^{heading}", docs, re.MULTILINE)] == []


@pytest.mark.parametrize("name", [name for name in forms() if set(carried(name, "whole")) < set(filters())])
def test_what_it_cannot_carry_is_refused_with_the_forms_that_can(name: str) -> None:
    for which in filters().keys() - set(carried(name, "whole")):
        with pytest.raises(StructureError, match=f'form "{name}" cannot carry the filter: .+ Forms that can: ') as refused:
            built(name, "whole", which)
        able = str(refused.value).partition("Forms that can: ")[2].rstrip(".").split(", ")
        assert name not in able
        assert {"direct-1", "direct-2"} <= set(able)
        assert all(which in carried(other, "whole") for other in able)


def test_filters_are_at_one_rate() -> None:
    assert {filter.rate for filter in filters().values()} == {RATE}


def test_a_refusal_of_high_order_comes_at_once() -> None:
    """Every form is asked which could; those that can only carry what is stable or symmetric ask for what is cheap first."""
    pairs = [rect(0.97 - k / 64, 0.1 + 2.9 * k / 32) for k in range(32)]
    filter = Filter.from_zeros_poles([], [pole for upper in pairs for pole in (upper, upper.conjugate())], 1.0, rate=RATE)
    began = process_time()
    with pytest.raises(StructureError, match=r"its recursion is of order 64.+ Forms that can: direct-1.+ lattice-normalized"):
        build(filter, form="coupled", decomposition="whole")
    assert process_time() - began < 2  # measured 0.7 s; before, more than 4 minutes
