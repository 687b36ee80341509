"""Roundings by names that a reader of the diagram knows."""

import pytest

from streamhost import Filter, Fixed, design, realize
from streamhost.measure.naming import rounding_name

PEAK = design("peak", rate=48000, frequency=3000.0, gain_db=6.0, q=2.0)


def names_in(form, filter=PEAK, **format):
    program = realize(filter, form=form, format=Fixed("Q1.15", coefficients="Q3.29", **format)).program
    return [rounding_name(program, index) for index in program.roundings]


@pytest.mark.parametrize(("form", "format", "names"), [
    ("direct-1", {}, ["the register y"]),
    ("direct-1", {"state": "Q1.31", "operand": "Q1.31"}, ["the output", "the register y"]),
    ("direct-1", {"state": "Q1.31"}, ["the operand y1", "the operand y2", "the output", "the register y"]),
    ("direct-2", {}, ["the output", "the register w"]),
    ("transposed-2", {"operand": "Q1.11"}, ["the operand x", "the operand y", "the register s1", "the register s2",
                                           "the register y"]),
])
def test_the_name_is_the_drawn_one(form, format, names):
    assert sorted(names_in(form, **format)) == names


def test_a_product_that_stands_alone_has_its_own_name():
    half = Filter.from_coefficients([0.3], [1.0], rate=48000)
    assert names_in("direct-1", half) == ["the output"]
    assert not any(".sum" in name or ".q" in name for name in names_in("transposed-1"))
