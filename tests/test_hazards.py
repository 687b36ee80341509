"""What is certain to be dangerous about a program: poles that zeros cancel, and poles that rounding moves to the circle."""

import pytest

from streamhost import Builder, Filter, Fixed, Float, realize
from streamhost.diagram.builder import minus
from streamhost.errors import FilterError
from streamhost.formats import Format, named_format
from streamhost.program.hazards import hazards_of
from streamhost.program.poles import cancelled_on_circle, on_and_outside
from streamhost.program.run import lower

WRAPPING = Fixed("Q1.15", overflow="wrap")


def running_sum(format: Format) -> tuple[str, ...]:
    """y[n] = x[n] - x[n-8] + y[n-1] as a user draws it, the sum not marked to grow."""
    builder = Builder()
    x = builder.input()
    state = builder.delay("s")
    y = builder.sum(x, minus(builder.delay("x8", x, n=8)), state, label="y")
    state.takes(y)
    builder.output(y)
    return hazards_of(lower(builder.build(), format))


def hazards(a: list[float], format: Format) -> tuple[str, ...]:
    return realize(Filter.from_coefficients([0.5], a, rate=48000), form="direct-1", format=format).hazards


@pytest.mark.parametrize(("format", "said"), [
    (Float("float32"), "its rounding in floating point is not"),
    (Float("float64"), "its rounding in floating point is not"),
    (named_format("16x16+40"), "its saturation is not"),
    (WRAPPING, "wraps and drops no bit, nothing is lost"),
    (Fixed("Q1.15", input="Q1.23", overflow="wrap"), "the bits that its loop drops are not"),
], ids=["float32", "float64", "saturating", "wrapping", "dropping"])
def test_a_cancelled_pole_is_told_with_what_its_loop_loses(format: Format, said: str) -> None:
    (hazard,) = running_sum(format)
    assert hazard.startswith("1 pole on the unit circle is cancelled by zeros, and the response is finite; ")
    assert said in hazard


def test_it_is_told_of_a_filter_given_so_and_not_of_an_integrator() -> None:
    """(1 - z^-8) / (1 - z^-1) in one section; 1 / (1 - z^-1) alone is cancelled by nothing and asked for."""
    def whole(b: list[float]) -> tuple[str, ...]:
        filter = Filter.from_coefficients(b, [1, -1], rate=48000)
        return realize(filter, form="direct-1", decomposition="whole", allow_unstable=True).hazards

    (hazard,) = whole([1, *[0] * 7, -1])
    assert "is cancelled by zeros, and the response is finite" in hazard
    assert whole([1]) == ()


def test_a_refusal_says_that_zeros_cancel_the_pole() -> None:
    """Of 1 - z^-8 over 1 - z^-1, of the same behind a delay, of zeros and poles; not of an integrator, nor of 0 / A."""
    filters = [Filter.from_coefficients([1, *[0] * 7, -1], [1, -1], rate=48000),
               Filter.from_coefficients([0, 1, *[0] * 7, -1], [1, -1], rate=48000),
               Filter.from_zeros_poles([1, -1], [1, 0.5], 1.0, rate=48000)]
    assert [each.cancelled_poles() for each in filters] == [1, 1, 1]
    for each in filters:
        with pytest.raises(FilterError, match="Zeros cancel 1 of them in the response, and nothing of what their loop"):
            realize(each)
    for b in ([1], [0], [1, 1]):
        assert Filter.from_coefficients(b, [1, -1], rate=48000).cancelled_poles() == 0
    assert Filter.from_coefficients([1, -2.5], [1, -3, 1.25], rate=48000).cancelled_poles() == 1  # poles 2.5 and 0.5


def test_a_pole_cancelled_beside_one_that_is_heard() -> None:
    """(1 - z^-2) / ((1 - z^-1) (1 - 0.5 z^-1)): the pole at 1 is cancelled, that at 0.5 stays."""
    filter = Filter.from_coefficients([1, 0, -1], [1, -1.5, 0.5], rate=48000)
    program = realize(filter, form="transposed-2", decomposition="whole", allow_unstable=True).program
    found = cancelled_on_circle(program)
    assert found is not None
    assert (found.poles, found.finite, found.lost) == (1, False, "floats")


def test_a_coefficient_rounded_onto_the_circle_and_over_it_are_told_apart() -> None:
    """In Q2.14: 0.99999 becomes 1. Of two real poles 1 + a1 + a2 tells: 0, one is at z = 1; below 0, one is beyond."""
    coarse = Fixed("Q1.15", coefficients="Q2.14")
    (onto,) = hazards([1, -1.5, 0.99999], coarse)
    assert onto.startswith("rounding the coefficients puts 2 poles on the unit circle: ")
    beyond = [1, -1.99993, 0.999935]  # 32767 and 16383 steps of 2^-14: 16384 - 32767 + 16383 = 0, on z = 1
    (on,) = hazards(beyond, coarse)
    assert on.startswith("rounding the coefficients puts 1 pole on the unit circle: ")
    # -1.99992 -> -32767 steps, 0.999923 -> 16383 steps less one with rounding down: 16384 - 32767 + 16382 < 0.
    (over,) = hazards([1, -1.99992, 0.999923], Fixed("Q1.15", coefficients={"word": "Q2.14", "rounding": "floor"}))
    assert over.startswith("rounding the coefficients puts 1 pole outside the unit circle: ")
    assert hazards([1, -1.5, 0.99999], Fixed("Q1.15", coefficients="Q2.22")) == ()


def test_poles_on_and_outside_are_of_the_worst_channel() -> None:
    filters = [Filter.from_coefficients([1], [1, a], rate=48000) for a in (-0.5, -1.0, -1.5)]
    diagram = realize(filters, form="direct-1", allow_unstable=True).program.diagram
    assert on_and_outside(diagram) == (0, 1)
