"""Import of coefficients in C source."""

from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from imported_tables import RATE, ROWS, SECTIONS, imported, refusal

from streamhost.errors import RequestError
from streamhost.filters import Filter
from streamhost.presets.importing.literals import literal, single

__all__ = ["imported", "refusal"]  # fixtures

TWO_ROWS = "{0.5, 1.0, 0.5, 1.0, -1.8, 0.9025}, {1.0, -2.0, 1.0, 1.0, 0.1, 0.2}"

# ITU-T G.729 (03/96) clause 3.1, eq. (1), pre-processing high-pass, and the integers of its C code (as quoted).
G729 = Filter.from_codes([[1899, -3798, 1899, 4096, -7807, 3733]], "Q4.12", rate=RATE)


@pytest.mark.parametrize(
    "content",
    [
        f"const double table[2][6] = {{{TWO_ROWS}}};",
        f"const double table[][6] =\n{{\n    {TWO_ROWS},\n}};\n",
        f"{{{TWO_ROWS}}}",
        f"/* {{1, 2}} */\n#define ROWS \\\n {{3}}\n// {{4\n{{{TWO_ROWS}}}\n",
        f"typedef struct {{ int n; }} any;\nint f(void) {{ return 1; }}\ndouble t[2][6] = {{{TWO_ROWS}}};",
        f'char text[] = "{{ = {{";\nchar mark = \'{{\';\ndouble t[2][6] = {{{TWO_ROWS}}};',
        "double t[2][6] = {{.5L, 1., 0x1p-1, +1, - 1.8, 9025e-4}, {1, -2, 0X1.0P0, 1.0l, .1, 2E-1}};",
    ],
)
def test_rows_of_an_array(content, imported):
    assert imported(content).filter == SECTIONS


def test_the_name_of_the_array_is_told(imported):
    notes = imported(f"static const double hum[2][6] = {{{TWO_ROWS}}};").notes
    assert notes[0] == "array: hum"


def test_a_flat_array_is_cut_where_the_columns_are_stated(imported):
    numbers = ", ".join(str(number) for row in ROWS for number in row)
    content = f"double sections[ROWS * 6] = {{ {numbers} }};"
    assert imported(content, columns="b0,b1,b2,a0,a1,a2").filter == SECTIONS


@pytest.mark.parametrize(
    "content",
    ["double b[2] = {0.25, 0.5}; double a[] = {2, -1.5};", "double a[] = {2, -1.5}, b[] = {0.25, 0.5};",
     "static const double hp_a[2] = {2, -1.5};\nstatic const double hp_b[2] = {0.25, 0.5};"],
)
def test_two_arrays_called_b_and_a(content, imported):
    assert imported(content, feedback="subtracted").filter == Filter.from_coefficients([0.25, 0.5], [2, -1.5], rate=RATE)


def test_an_array_called_b_is_a_finite_response(imported):
    assert imported("double fir_b[3] = {1, 0.5, 0.25};").filter == Filter.from_coefficients([1, 0.5, 0.25], rate=RATE)


def test_published_codes_whose_feedback_is_added(imported):
    found = imported("int16_t hp_b[3] = {1899, -3798, 1899};\nint16_t hp_a[3] = {4096, 7807, -3733};", word="Q4.12")
    assert found.filter == G729
    assert found.notes == (
        "array: hp_b", "array: hp_a", "word: Q4.12, the value of a code c is c / 4096, as asked",
        ("feedback: added, found by stability: subtracted, the filter would be unstable; a1, a2 and so on stand in the preset "
        "with the other sign"),
    )


def test_hexadecimal_codes_are_twos_complement(imported):
    # 65536 - 7807 = 0xE181, 65536 - 3798 = 0xF12A
    found = imported("{{0x076B, 0xF12AU, 0x76b, 0x1000, 0xE181, 0x0E95}}", word="Q4.12")
    assert found.filter == G729
    assert found.notes[2] == "hexadecimal: 2 read as two's complement, since above the largest code"


def test_float_means_float32(imported):
    found = imported("float b[4] = {0.1f, 0.1, 1, 0.5};")
    tenth = 13421773 / 2**27  # the float32 nearest to 0.1: 1.6 * 2^-4, with 23 fraction bits 13421772.8 * 2^-27
    assert found.filter == Filter.from_coefficients([tenth, tenth, 1, 0.5], rate=RATE)
    assert found.notes == ("array: b", "float32: rounded to it, as C does, were 2 numbers that it does not hold as written")


def test_the_suffix_f_rounds_once(imported):
    # A little above the middle between 1 and the next float32; float64 has the middle itself, from where it goes to 1.
    written = "1.00000005960464477539062500001"
    assert imported(f"double b[2] = {{{written}f, 1}};").filter.factors[0].b == (1 + 2**-23, 1.0)
    assert imported(f"float b[2] = {{{written}, 1}};").filter.factors[0].b == (1.0, 1.0)


@given(st.floats(min_value=-3e38, max_value=3e38).filter(lambda x: x == 0 or abs(x) > 2e-45))
def test_single_gives_the_nearest_float32(value):
    text = repr(value)
    found = single(literal(text, ""), text).value
    near = np.float32(found)
    assert float(near) == found
    distance = abs(Fraction(found) - Fraction(text))
    with np.errstate(over="ignore"):  # the neighbour of the largest float32
        neighbours = [float(np.nextafter(near, np.float32(way))) for way in (-np.inf, np.inf)]
    assert all(distance <= abs(Fraction(other) - Fraction(text)) for other in neighbours if np.isfinite(other))


@given(st.floats(width=32, allow_nan=False, allow_infinity=False))
def test_a_float32_written_in_either_base_is_itself(value):
    for text in (repr(value), value.hex()):
        assert single(literal(text, ""), text).value == value


@pytest.mark.parametrize(("text", "said"), [("3.5e38", "larger than float32"), ("-1e-46", "smaller than float32")])
def test_what_float32_does_not_hold(text, said):
    with pytest.raises(RequestError, match=f"^here: {text.replace('e38', r'e.38')} is {said}"):
        single(literal(text, "here"), text)


WORKED_OUT = "Numbers are read, with their sign and suffix; names, casts and expressions are not worked out."
WRONG = [
    ("int f(void) { return 1; }",
     "the file has braces, and no array with its numbers between them, as in b[3] = {0.5, 1.0, 0.5}."),
    ("double b[] = {0.5,\n  GAIN};", f'line 2, column 3: "GAIN" is no number. {WORKED_OUT}'),
    ("double b[] = {(float)1};", f'line 1, column 15: "(" is no number. {WORKED_OUT}'),
    ("double b[] = {1.0/3};", f'line 1, column 18: "/" follows a number; , or }} does. {WORKED_OUT}'),
    ("double b[] = {--1.0};", f'line 1, column 15: "--" is no number. {WORKED_OUT}'),
    ("double b[] = {[0] = 1.0};", f'line 1, column 15: "[" is no number. {WORKED_OUT}'),
    ("any b = {.b0 = 1.0};", f'line 1, column 10: "." is no number. {WORKED_OUT}'),
    ("double b[] = {0x1.8};", f'line 1, column 15: "0x1.8" is no number. {WORKED_OUT}'),
    ("double b[] = {1.0q};", f'line 1, column 15: "1.0q" is no number. {WORKED_OUT}'),
    ("double b[] = {1.0.0};", 'line 1, column 15: "1.0.0" is no number. Decimals have a point: 0.5.'),
    ("double b[] = {'1'};", f"line 1, column 15: \"'1'\" is no number. {WORKED_OUT}"),
    ("int b[] = {010};", "line 1, column 12: 010 is octal in C, since it begins with 0; write it without the 0."),
    ("double b[] = {1.0,, 2.0};", f'line 1, column 19: "," is no number. {WORKED_OUT}'),
    ("double b[] = {};", "line 1, column 14: nothing stands in these braces."),
    ("double t[][5] = {{}};", "line 1, column 18: nothing stands in these braces."),
    ("double b[] = {1.0,\n 2.0", "line 2, column 2: the file ends after this, inside the braces of an array."),
    ("double b[] = {1.0, /* 2.0}", "line 1, column 18: the file ends after this, inside the braces of an array."),
    ("{", "line 1, column 1: the file ends after this, inside the braces of an array."),
    ("double t[][5] = {{1.0, 2, 3, 0, 0}, 1.0};", "line 1, column 37: a row in braces belongs here, as before it."),
    ("double t[] = {1.0, {1.0}};", f'line 1, column 20: "{{" is no number. {WORKED_OUT}'),
    ("double t[][1][1] = {{{1.0}}};", f'line 1, column 22: "{{" is no number. {WORKED_OUT}'),
    ("double b[][2] = {{1.0, 2.0}};", "line 1, column 17: the array b has rows, and b and a are lists of numbers."),
    ("double t[] = {1.0}, u[] = {1.0};", "the file has 2 arrays, t, u. Leave one of them, or two, called b and a."),
    ("double x_b[] = {1.0}, y_b[] = {1.0};", "the file has 2 arrays, x_b, y_b. Leave one of them, or two, called b and a."),
    ("double b[] = {1e400};", "line 1, column 15: 1e400 is larger than float64 holds (about 1.8e308)."),
    ("double b[] = {0x1p5000};", "line 1, column 15: 0x1p5000 is larger than float64 holds (about 1.8e308)."),
    ("double b[] = {0x1p-5000};", "line 1, column 15: 0x1p-5000 is smaller than float64 holds (about 4.9e-324), and not 0."),
    ("float b[] = {1e39};", "line 1, column 14: 1e+39 is larger than float32 holds (about 3.4e38)."),
    ("double t[] = {1.0, 2.0};", ("the file has one list, of length 2, and does not say of what. State --columns "
                                 "b0,b1,b2,a0,a1,a2 (in its order, without a0 where it is left out) for sections one after "
                                 "the other, or --columns b for the coefficients of a finite response.")),
    ("double b[] = {" + "1.0," * 20_001 + "}", "the file has more than 20000 numbers, which is more than a preset holds."),
    ("{" + ";" * 200_000, "the file has more than 200000 words of C, too many for a table of coefficients."),
]


@pytest.mark.parametrize(("content", "expected"), WRONG, ids=range(len(WRONG)))
def test_what_is_wrong_in_c_is_told_with_its_place(content, expected, refusal):
    assert refusal(content) == expected
