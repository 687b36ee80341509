"""Difference equations as text, read into exact coefficients, and refused with the place marked."""

from fractions import Fraction

import pytest

from streamhost.errors import FilterError
from streamhost.filters import Filter
from streamhost.filters.equation import coefficients
from streamhost.presets import parse_preset

F = Fraction
ONE = [F(1)]
HALF = F(1, 2)

# text -> b, a by hand, in powers of z^-1 and the transfer function's sign
READ = {
    "y[n] = 0.5 x[n] + 0.5 x[n-1] + 0.9 y[n-1]": ([HALF, HALF], [F(1), F(-9, 10)]),
    "y[n] = x[n]": (ONE, ONE),
    "y[n] = 0": ([F(0)], ONE),
    "y[n] = 2 x[n]": ([F(2)], ONE),
    "y[n]=2x[n]": ([F(2)], ONE),
    "y[n] = 2*x[n]": ([F(2)], ONE),
    "y[n] = x[n]*2": ([F(2)], ONE),
    "y(n) = 2 x(n)": ([F(2)], ONE),
    "y [ n ] = x( n - 2 )": ([F(0), F(0), F(1)], ONE),
    "y[n] = x[n-0] + x[n+0]": ([F(2)], ONE),
    "y[n] = -x[n] - -x[n-1] + -x[n-2]": ([F(-1), F(1), F(-1)], ONE),
    "y[n] = 1/3 x[n]": ([F(1, 3)], ONE),
    "y[n] = 1/3x[n]": ([F(1, 3)], ONE),
    "y[n] = x[n]/3": ([F(1, 3)], ONE),
    "y[n] = 2/3/5 x[n] * -7": ([F(-14, 15)], ONE),
    "y[n] = .5x[n] + 5.x[n-1]": ([HALF, F(5)], ONE),
    "y[n] = 1e-3 x[n] + 2E2x[n-1] + 1.5e+1 x[n-2]": ([F(1, 1000), F(200), F(15)], ONE),
    "y[n] = (x[n] + x[n-1] + x[n-2])/3": ([F(1, 3)] * 3, ONE),
    "y[n] = 1/2 (x[n] - 2(x[n-1] - y[n-1]))": ([HALF, F(-1)], [F(1), F(-1)]),
    "y[n] = (1 + 2) x[n]": ([F(3)], ONE),
    "y[n] = x[n] + x[n]": ([F(2)], ONE),
    "y[n] - 0.9 y[n-1] = x[n]": (ONE, [F(1), F(-9, 10)]),
    "0 = x[n] - y[n]": (ONE, ONE),
    "x[n] = y[n] + y[n-2]": (ONE, [F(1), F(0), F(1)]),
    "3 y[n] = x[n] + 0.3 y[n-1]": ([F(1, 3)], [F(1), F(-1, 10)]),
    "y[n] = 2 x[n] + 0.5 y[n]": ([F(4)], ONE),
    "y[n] = x[n]\n     + 0.5 x[n-1]\r\n\t- y[n-1]\n": ([F(1), HALF], [F(1), F(1)]),
    "# an equation\ny[n] = x[n]  # of = one * term ?\n # recursive: no": (ONE, ONE),
    "y[n] = x[n] \N{MINUS SIGN} 3\N{MIDDLE DOT}x[n-1] + 2\N{MULTIPLICATION SIGN}x[n-2]": ([F(1), F(-3), F(2)], ONE),
}


@pytest.mark.parametrize(("text", "expected"), READ.items(), ids=READ)
def test_equations_are_read_exactly(text: str, expected: tuple[list[F], list[F]]) -> None:
    assert coefficients(text) == expected


def test_a_filter_has_each_quotient_rounded_once() -> None:
    made = Filter.from_equation("3 y[n] = x[n] + 0.3 x[n-1] + 0.9 y[n-1]", rate=44100)
    assert made == Filter.from_coefficients([F(1, 3), F(1, 10)], [1, F(-3, 10)], rate=44100)
    assert made.sections()[0].b == (1 / 3, 0.1)
    # 0.1 + 0.2 in float64 is another number than 0.3, which is nearest to the exact sum.
    assert Filter.from_equation("y[n] = 0.1 x[n] + 0.2 x[n]", rate=1).sections()[0].b == (0.3,)


def test_a_preset_states_an_equation() -> None:
    stated = 'rate = 8000\n[[filter]]\nequation = """\ny[n] = 1/3 x[n]  # over two lines\n     + 0.9 y[n-1]"""\n'
    assert parse_preset(stated).filter == Filter.from_coefficients([F(1, 3)], [1, F(-9, 10)], rate=8000)


@pytest.mark.parametrize(("text", "recursive"), [
    ("y[n] = x[n] + 0.5 y[n-1]", True),
    ("y[n] = x[n] - x[n-8] + y[n-1]", True),
    ("y[n] = x[n] + 0.5 x[n-1]", False),
    ("y[n] = x[n] + 0 y[n-1]", False),
    ("y[n] + y[n-3] = x[n] + y[n-3]", False),
    ("y[n] = x[n] + 0.5 y[n]", False),
])
def test_what_is_recursive_is_known(text: str, recursive: bool) -> None:
    assert Filter.from_equation(text, rate=48000).is_recursive is recursive


REFUSED = {
    "y[n+1] = x[n]": """
equation, column 1: y[n+1] lies in the future, which a filter does not know; a time is n, n-1, n-2 and so on.
    y[n+1] = x[n]
    ^""",
    "y[n] = 0.5 x[n + 2]": """
equation, column 12: x[n+2] lies in the future, which a filter does not know; a time is n, n-1, n-2 and so on.
    y[n] = 0.5 x[n + 2]
               ^""",
    "y[n] = x[n]*y[n]": """
equation, column 13: a product of two signals is not linear; perhaps a + or - is missing before it.
    y[n] = x[n]*y[n]
                ^""",
    "y[n] = x[n] x[n-1]": """
equation, column 13: a product of two signals is not linear; perhaps a + or - is missing before it.
    y[n] = x[n] x[n-1]
                ^""",
    "y[n] = (x[n] + 1)(x[n-1] + 1)": """
equation, column 18: a product of two signals is not linear; perhaps a + or - is missing before it.
    y[n] = (x[n] + 1)(x[n-1] + 1)
                     ^""",
    "y[n] = 1/x[n]": """
equation, column 10: a division by a signal is not linear; only numbers divide.
    y[n] = 1/x[n]
             ^""",
    "y[n] = x[n]/(1 - 1)": """
equation, column 13: this divides by 0.
    y[n] = x[n]/(1 - 1)
                ^""",
    "y[n] = x[n] + 1": """
equation, column 15: a filter adds no constant; every term is a number times x[n-k] or y[n-k].
    y[n] = x[n] + 1
                  ^""",
    "y[n-1] = x[n]": """
equation, column 1: y[n] is missing, or its terms cancel; the equation must say what y[n] is.
    y[n-1] = x[n]
    ^""",
    "x[n] = 0": """
equation, column 1: y[n] is missing, or its terms cancel; the equation must say what y[n] is.
    x[n] = 0
    ^""",
    "x[n] + y[n] = y[n] + y[n-1]": """
equation, column 8: y[n] is missing, or its terms cancel; the equation must say what y[n] is.
    x[n] + y[n] = y[n] + y[n-1]
           ^""",
    "y[n] = 0.5 z[n-1]": """
equation, column 12: "z" is not known; the signals are x and y, each with a time, as in x[n-1].
    y[n] = 0.5 z[n-1]
               ^""",
    "y[n] = b0 x[n]": """
equation, column 8: "b0" is not known; the signals are x and y, each with a time, as in x[n-1].
    y[n] = b0 x[n]
           ^""",
    "y[n] = x1[n]": """
equation, column 8: "x1" is not known; the signals are x and y, each with a time, as in x[n-1]. Did you mean "x"?
    y[n] = x1[n]
           ^""",
    "y = x[n]": """
equation, column 1: y stands without a time; write y[n], y[n-1] and so on.
    y = x[n]
    ^""",
    "y[n] = x[k-1]": """
equation, column 10: a time begins with n; it is n, n-1, n-2 and so on.
    y[n] = x[k-1]
             ^""",
    "y[n] = x[n-k]": """
equation, column 12: a whole number is missing here; a time is n, n-1, n-2 and so on.
    y[n] = x[n-k]
               ^""",
    "y[n] = x[n-1.5]": """
equation, column 12: a whole number is missing here; a time is n, n-1, n-2 and so on.
    y[n] = x[n-1.5]
               ^""",
    "y[n] = x[n-1)": """
equation, column 13: a ] is missing here; a time is n, n-1, n-2 and so on.
    y[n] = x[n-1)
                ^""",
    "y[n] = x[n-10001]": """
equation, column 12: this is too long ago; the oldest time is n-10000.
    y[n] = x[n-10001]
               ^""",
    "y[n] = 0.5 0.5 x[n]": """
equation, column 12: a number follows here without a sign; write * for a product, + or - for a sum.
    y[n] = 0.5 0.5 x[n]
               ^""",
    "y[n] = x[n] +": """
equation, column 14: a term is missing here; a term is a number times x[n-k] or y[n-k].
    y[n] = x[n] +
                 ^""",
    "= x[n]": """
equation, column 1: a term is missing here; a term is a number times x[n-k] or y[n-k].
    = x[n]
    ^""",
    "y[n] + x[n]  # no more": """
equation, column 12: a = is missing here; an equation is written like y[n] = 0.5 x[n] + 0.9 y[n-1].
    y[n] + x[n]  # no more
               ^""",
    "y[n] = x[n] = 0": """
equation, column 13: this is a second =; an equation has one.
    y[n] = x[n] = 0
                ^""",
    "y[n] = x[n])": """
equation, column 12: this ) closes nothing; no ( is open here.
    y[n] = x[n])
               ^""",
    "y[n] = x[n][n]": """
equation, column 12: [ ] follow x or y and hold a time, as in x[n-1].
    y[n] = x[n][n]
               ^""",
    "y[n] = (x[n]": """
equation, column 13: a ) is missing here.
    y[n] = (x[n]
                ^""",
    "y[n] = x[n] ^ 2": """
equation, column 13: "^" is no part of an equation, which is made of numbers, x[n-k], y[n-k], + - * / ( ) and one =.
    y[n] = x[n] ^ 2
                ^""",
    "y[n] = x[n]\x07": """
equation, column 12: U+0007 is no part of an equation, which is made of numbers, x[n-k], y[n-k], + - * / ( ) and one =.
    y[n] = x[n]?
               ^""",
    "y[n] = 1e308 x[n] * 10": """
equation, column 14: the coefficient of x[n], divided by that of y[n], is larger than float64 holds (about 1.8e308).
    y[n] = 1e308 x[n] * 10
                 ^""",
    "1e200 y[n] = 1e-200 x[n-3]": """
equation, column 21: the coefficient of x[n-3], divided by that of y[n], is smaller than float64 holds (about 4.9e-324), \
and not 0.
    1e200 y[n] = 1e-200 x[n-3]
                        ^""",
    "y[n] = 1e1001 x[n]": """
equation, column 8: this number is too long: at most 1000 digits and an exponent of at most 1000 are read.
    y[n] = 1e1001 x[n]
           ^""",
    "y[n] = 1e999*1e999 x[n]": """
equation, column 14: the numbers of this term are too long to be kept exact; they take more than 4096 bits.
    y[n] = 1e999*1e999 x[n]
                 ^""",
    "y[n] = x[n]\n     + 0.5 x[n-1]\n     + 0.9 u[n-1]\n     + x[n-2]": """
equation, line 3, column 12: "u" is not known; the signals are x and y, each with a time, as in x[n-1].
         + 0.9 u[n-1]
               ^""",
    "y[n] = x[n]\n\t+\tx": """
equation, line 2, column 4: x stands without a time; write x[n], x[n-1] and so on.
     + x
       ^""",
}


@pytest.mark.parametrize(("text", "expected"), REFUSED.items(), ids=map(repr, REFUSED))
def test_what_is_refused_is_marked(text: str, expected: str) -> None:
    with pytest.raises(FilterError) as caught:
        Filter.from_equation(text, rate=48000)
    assert str(caught.value) == expected.lstrip("\n")


def refusal(text: object) -> str:
    with pytest.raises(FilterError) as caught:
        coefficients(text)
    return str(caught.value)


@pytest.mark.parametrize("text", ["", " \n ", "# nothing"])
def test_an_empty_equation_is_refused(text: str) -> None:
    assert refusal(text) == "equation is empty; it is written like y[n] = 0.5 x[n] + 0.9 y[n-1]."


def test_what_is_no_text_or_too_long_is_refused() -> None:
    assert refusal(3) == "equation is of type int; it is a text, for instance y[n] = 0.5 x[n] + 0.9 y[n-1]."
    assert refusal(" " * 1_000_001) == "equation has 1000001 characters; at most 1000000 are read."


def test_of_a_long_line_the_surroundings_are_shown() -> None:
    first, shown, mark = refusal("y[n] = " + "x[n]+" * 50 + "q[n]" + "+x[n]" * 50).split("\n")
    assert first.startswith('equation, column 258: "q"')
    assert shown.startswith("    ...")
    assert shown.endswith("...")
    assert len(shown) == len("    ......") + 72
    assert shown[mark.index("^"):].startswith("q[n]+x[n]")
    _, shown, mark = refusal("q" + "+x[n]" * 50).split("\n")
    assert shown.startswith("    q+x[n]")
    assert mark == "    ^"


def test_a_line_with_wide_characters_is_shown_so_that_the_mark_stands_below() -> None:
    wide = "\N{CJK UNIFIED IDEOGRAPH-5B57}"
    assert refusal(f"y[n] = x[n] + {wide}[n] + q").split("\n")[1:] == ["    y[n] = x[n] + ?[n] + q", " " * 18 + "^"]


def test_brackets_go_sixteen_deep() -> None:
    assert coefficients("y[n] = " + "(" * 16 + "x[n]" + ")" * 16) == (ONE, ONE)
    assert "column 24: this is more than 16 brackets deep." in refusal("y[n] = " + "(" * 17 + "x[n]" + ")" * 17)


def test_the_oldest_time_can_be_had() -> None:
    b, a = coefficients("y[n] = x[n-10000] - y[n-10000]")
    assert (len(b), len(a)) == (10001, 10001)
    assert (b[-1], a[-1], any(b[:-1]), any(a[1:-1])) == (1, 1, False, False)
