"""Equation -> filter -> diagram -> equation and back: the same coefficients, to the last bit."""

from collections.abc import Iterator
from fractions import Fraction
from itertools import cycle
from random import Random

import numpy as np
import pytest
from diagram_examples import direct_1
from form_filters import DIRECT
from hypothesis import given
from hypothesis import strategies as st

from streamhost.diagram.difference import difference
from streamhost.diagram.loop_matrices import loop_matrices
from streamhost.diagram.polynomials import determinant, product
from streamhost.filters import Filter
from streamhost.filters.equation import coefficients
from streamhost.structures import build

EQUATIONS = 1000

Terms = dict[tuple[str, int], Fraction]


def number(rng: Random) -> tuple[str, Fraction]:
    """A number not 0 as someone might write it, and its value."""
    digits = rng.randint(1, 9999)
    match rng.randrange(5):
        case 0:
            return str(digits), Fraction(digits)
        case 1:
            below = rng.randint(1, 99)
            return f"{digits}/{below}", Fraction(digits, below)
        case 2:
            return f"0.{digits:05}", Fraction(digits, 10**5)
        case 3:
            exponent = rng.randint(-12, 5)
            return f"{digits}{rng.choice('eE')}{exponent}", digits * Fraction(10) ** exponent
    return f"({digits} - 1/7)", Fraction(7 * digits - 1, 7)


def term(rng: Random, name: str, age: int) -> tuple[str, Fraction]:
    text, value = number(rng)
    opening, closing = rng.choice(("[]", "()"))
    blank = rng.choice(("", " "))
    time = f"n{blank}-{blank}{age}" if age else "n"
    signal = f"{name}{opening}{time}{closing}"
    written = rng.choice([f"{text} {signal}", f"{text}*{signal}", f"{signal} * {text}", f"{text}{signal}"])
    return written, value


def side(rng: Random, keys: list[tuple[str, int]]) -> tuple[str, Terms]:
    """A sum of one term for each key, over several lines, and what it comes to."""
    total: Terms = {}
    text = ""
    for name, age in keys:
        written, value = term(rng, name, age)
        sign = rng.choice(("+", "-"))
        text += f"{rng.choice((' ', '', chr(10) + '   '))}{sign}{rng.choice(('', ' '))}{written}"
        total[name, age] = total.get((name, age), Fraction(0)) + (value if sign == "+" else -value)
    return text or "0", total


def random_equation(rng: Random) -> tuple[str, list[Fraction], list[Fraction]]:
    """An equation, and its b and a worked out from the pieces that it is put together of."""
    keys = [(name, age) for name in "xy" for age in range(rng.randint(0, 6)) if rng.random() < 0.8]
    keys += [("y", 0), *rng.choices(keys, k=2)] if keys else [("y", 0), ("x", 3)]
    rng.shuffle(keys)
    cut = rng.randint(0, len(keys))
    (left, total), (right, others) = side(rng, keys[:cut]), side(rng, keys[cut:])
    for key, value in others.items():
        total[key] = total.get(key, Fraction(0)) - value
    leading = total["y", 0]
    if leading == 0:
        return random_equation(rng)
    b, a = ([total.get((name, age), Fraction(0)) / leading for age in range(7)] for name in "xy")
    return f"{left} = {right}", [-c for c in b], a


def random_equations() -> Iterator[tuple[str, list[Fraction], list[Fraction]]]:
    rng = Random(20)
    for _ in range(EQUATIONS):
        yield random_equation(rng)


def padded(polynomial: list[Fraction]) -> list[Fraction]:
    return polynomial + [Fraction(0)] * (7 - len(polynomial))


def test_a_thousand_equations_are_read_exactly() -> None:
    orders = set()
    for text, b, a in random_equations():
        read_b, read_a = coefficients(text)
        assert (padded(read_b), padded(read_a)) == (b, a), text
        orders.add((any(b), any(a[1:])))
    assert orders == {(False, False), (False, True), (True, False), (True, True)}


def test_a_thousand_equations_come_back_from_the_forms() -> None:
    for (text, b, a), form in zip(random_equations(), cycle(DIRECT), strict=False):
        asked = Filter.from_equation(text, rate=48000)
        read = build(asked, form=form, decomposition="whole").diagram.equation()
        back = Filter.from_equation(read, rate=48000)
        assert back == asked, text
        assert padded([*map(Fraction, back.whole()[0])]) == [Fraction(float(c)) for c in b]
        assert padded([*map(Fraction, back.whole()[1])]) == [Fraction(float(c)) for c in a]
        assert ("# recursive" in read) is any(a[1:])
        assert ("# not recursive" in read) is not any(a[1:])


finite = st.floats(allow_nan=False, allow_infinity=False)


@given(st.lists(finite, min_size=1, max_size=6), st.lists(finite, max_size=5))
def test_any_coefficients_come_back(b: list[float], a: list[float]) -> None:
    asked = Filter.from_coefficients(b, [1.0, *a], rate=48000)
    assert Filter.from_equation(direct_1(b, [1.0, *a]).equation(), rate=48000).whole() == asked.whole()


def high(order: int) -> tuple[list[float], list[float]]:
    rng = np.random.default_rng(order)
    return rng.normal(size=order + 1).tolist(), [1.0, *(0.1 * rng.normal(size=order))]


@pytest.mark.parametrize("form", DIRECT)
def test_order_24_comes_back(form: str) -> None:
    asked = Filter.from_coefficients(*high(24), rate=48000)
    read = build(asked, form=form, decomposition="whole").diagram.equation()
    assert Filter.from_equation(read, rate=48000) == asked


def test_order_200_comes_back() -> None:
    b, a = high(200)
    assert Filter.from_equation(direct_1(b, a).equation(), rate=48000).whole() == (tuple(b), tuple(a))


def sections(count: int) -> Filter:
    rng = np.random.default_rng(count)
    rows = [[*rng.normal(size=3), 1.0, *rng.uniform(-0.7, 0.7, size=2)] for _ in range(count)]
    return Filter.from_sections(rows, rate=48000)


@pytest.mark.parametrize("form", DIRECT)
@pytest.mark.parametrize("count", [1, 2, 7, 20])
def test_a_cascade_reads_as_the_product_of_its_sections(form: str, count: int) -> None:
    asked = sections(count)
    read = build(asked, form=form).diagram.equation()
    # Both multiply the sections exactly and round once, so there is no tolerance.
    assert Filter.from_equation(read, rate=48000).whole() == asked.whole()


@pytest.mark.parametrize("form", DIRECT)
def test_a_scaled_cascade_has_the_same_equation(form: str) -> None:
    asked = sections(4)
    read = Filter.from_equation(build(asked, form=form, scaling="l2").diagram.equation(), rate=48000)
    # Scaling rounds three numerator coefficients a section and a gain: each product of 2^4 or so terms is off by some
    # 20 roundings of 1.1e-16 of the largest; the recursion is not touched.
    np.testing.assert_allclose(read.whole()[0], asked.whole()[0], rtol=0, atol=1e-12 * max(map(abs, asked.whole()[0])))
    assert read.whole()[1] == asked.whole()[1]


@pytest.mark.parametrize("form", DIRECT)
def test_the_denominator_is_that_of_the_loops(form: str) -> None:
    diagram = build(sections(3), form=form).diagram
    whole = [Fraction(1)]
    for matrix in loop_matrices(diagram):
        whole = product(whole, determinant(matrix))
    assert list(difference(diagram, diagram.outputs[0]).denominator) == whole
