"""What an import decides where a file leaves something open, what it says of it, and what it asks for instead."""

from fractions import Fraction

import pytest
from hypothesis import assume, given
from hypothesis import strategies as st
from imported_tables import RATE, imported, refusal

from streamhost.errors import RequestError
from streamhost.filters import Filter
from streamhost.presets.importing import import_filter

__all__ = ["imported", "refusal"]  # fixtures

ASK = (
    "State --feedback subtracted where y[n] = b0 x[n] + ... - a1 y[n-1] - a2 y[n-2], the sign of the transfer function, or "
    "--feedback added where y[n] = b0 x[n] + ... + a1 y[n-1] + a2 y[n-2]."
)
USUAL = "b0,b1,b2,a0,a1,a2, the usual order, since the file names none (--columns states another)"


# Feedback


def test_the_sign_of_the_feedback_is_found_where_only_one_is_stable(imported):
    subtracted, added = imported("1 0 0 1 -1.8 0.9025\n"), imported("1 0 0 1 1.8 -0.9025\n")
    assert subtracted.filter == added.filter == Filter.from_sections([[1, 0, 0, 1, -1.8, 0.9025]], rate=RATE)
    assert subtracted.notes == (
        f"columns: {USUAL}", "feedback: subtracted, found by stability: added, the filter would be unstable",
    )
    assert added.notes[1] == (
        "feedback: added, found by stability: subtracted, the filter would be unstable; a1, a2 and so on stand in the preset "
        "with the other sign"
    )


def test_one_section_decides_for_all(imported):
    found = imported("1 0 0 1 0.5 0\n1 0 0 1 1.8 -0.9025\n")
    assert found.filter == Filter.from_sections([[1, 0, 0, 1, -0.5, 0], [1, 0, 0, 1, -1.8, 0.9025]], rate=RATE)


@pytest.mark.parametrize(
    "content",
    ["1 0 0 1 0.5 0.25\n", "b 1.0\na 1 -0.9\n", '{"sos": [[1, 0, 0, 1, -0.9, 0.0]]}', "double b[] = {1}, a[] = {1, 0.5};"],
)
def test_the_feedback_is_asked_for_where_both_signs_are_stable(content, refusal, imported):
    assert refusal(content) == f"the filter is stable whichever sign its feedback has, so that the file does not tell. {ASK}"
    subtracted, added = (imported(content, feedback=sign).filter for sign in ("subtracted", "added"))
    given, turned = subtracted.factors[0], added.factors[0]
    assert turned.b == given.b
    assert turned.a == (1.0, *(-value for value in given.a[1:]))


def test_a_filter_unstable_in_both_signs_is_asked_for(refusal, imported):
    content = "1 0 0 1 -2.5 0.5\n"
    assert refusal(content) == (
        "the filter is unstable whichever sign its feedback has. If the numbers are other than they were taken for, state "
        f"--columns; if it is meant to be unstable: s{ASK[1:]}"
    )
    found = imported(content, feedback="subtracted")
    assert found.filter == Filter.from_sections([[1, 0, 0, 1, -2.5, 0.5]], rate=RATE)
    assert found.notes[-1] == "stability: UNSTABLE; nothing runs it until the preset says allow_unstable = true"


def test_a_pole_on_the_circle_is_unstable(imported):
    assert imported("b 1.0\na 1 0 1.0\n", feedback="subtracted").notes[-1].startswith("stability: UNSTABLE")


def test_a_filter_without_feedback_is_asked_nothing(imported):
    assert imported("1 2 1 1.0 0 0\n").notes == (f"columns: {USUAL}",)


def test_a_long_a_is_not_put_to_the_test(refusal, imported):
    at_the_limit, beyond = "b 1.0\na 1" + " 0.0" * 63 + " -0.5", "b 1.0\na 1" + " 0.0" * 64 + " -0.5"
    assert refusal(at_the_limit).startswith("the filter is stable whichever sign")
    assert refusal(beyond) == (
        f"the feedback is of a higher order than 64, too high for its sign to be found by an exact test of stability. {ASK}"
    )
    assert imported(beyond, feedback="subtracted").notes[-1] == "stability: not tested, the order is too high"
    # Together they count as one; sections of second order do not count at all.
    tenth = "b 1.0\na 1" + " 0.0" * 9 + " -0.5\n"
    assert refusal(tenth * 6).startswith("the filter is stable")
    assert refusal(tenth * 7).startswith("the feedback is of a higher order")
    assert refusal("1 0 0 1 0.5 0\n" * 30).startswith("the filter is stable")


hundredths = st.integers(-250, 250).map(lambda whole: Fraction(whole, 100))


def in_triangle(a1, a2):
    """Where 1 + a1 z^-1 + a2 z^-2 has its roots inside the unit circle (Oppenheim & Schafer; Jackson)."""
    return abs(a2) < 1 and abs(a1) < 1 + a2


@given(st.lists(st.tuples(hundredths, hundredths), min_size=1, max_size=3))
def test_stability_decides_as_the_triangle_of_second_order_says(folder, feedback):
    # A decimal on an edge of the triangle can leave it or not by its rounding to float64.
    assume(all(abs(a2) != 1 and abs(a1) not in (1 + a2, 1 - a2) for a1, a2 in feedback))
    assume(any(a1 or a2 for a1, a2 in feedback))
    file = folder / "sections"
    file.write_text("".join(f"1 0 0 1.0 {float(a1)} {float(a2)}\n" for a1, a2 in feedback))
    stable = [name for name, sign in (("subtracted", 1), ("added", -1))
              if all(in_triangle(sign * a1, sign * a2) for a1, a2 in feedback)]
    if len(stable) == 1:
        assert f"feedback: {stable[0]}, found by stability" in import_filter(file, rate=RATE).notes[1]
    else:
        with pytest.raises(RequestError, match=r"the filter is (un)?stable whichever sign") as caught:
            import_filter(file, rate=RATE)
        assert ("unstable whichever" in str(caught.value)) == (not stable)


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    return tmp_path_factory.mktemp("imports")


# Columns


def test_columns_as_stated(imported):
    found = imported("1 -1.8 0.9025 0.5 1.0 0.25\n", columns="a0, a1,A2,b0,b1,b2")
    assert found.filter == Filter.from_sections([[0.5, 1, 0.25, 1, -1.8, 0.9025]], rate=RATE)
    assert found.notes[0] == "columns: a0,a1,a2,b0,b1,b2, as asked"


def test_columns_that_are_not_read(imported):
    found = imported("7 0.5 1 0.25 99 -1.8 0.9025\n", columns="-,b0,b1,b2,-,a1,a2")
    assert found.filter == Filter.from_sections([[0.5, 1, 0.25, 1, -1.8, 0.9025]], rate=RATE)


def test_another_order_is_not_passed_over(refusal):
    assert refusal("1 -1.8 0.9025 0.5 1.0 0.25\n1 -1.7 0.9 0.5 1 0.25\n") == (
        "the columns may stand in another order than b0,b1,b2,a0,a1,a2: column 1 is 1 in every row, as a0 mostly is, and "
        "column 4 is not. State the order with --columns."
    )
    assert "column 3 is 4096 in every row" in refusal("9 8 4096 1 -7807 3733\n", word="Q4.12")


def test_an_a0_other_than_1_is_divided_out_and_told(imported):
    found = imported("1 0.5 0 2 -3.6 1.805\n1 0.5 0 1 0 0\n3 0.5 0 4 -3.6 1.805\n")
    assert found.filter == Filter.from_sections(
        [[1, 0.5, 0, 2, -3.6, 1.805], [1, 0.5, 0, 1, 0, 0], [3, 0.5, 0, 4, -3.6, 1.805]], rate=RATE
    )
    assert found.notes[1] == "a0: divided out, 2 at line 1, column 9 and not 1 in 1 more"


@pytest.mark.parametrize("content", ["b 1.0 -1e-300\na 1e100\n", "b 1.0 0\na 1e100 1e-300\n"])
def test_what_vanishes_in_the_division_by_a0_is_refused(content, refusal):
    place, written = ("line 1, column 7", "-1e-300") if "-1e" in content.partition("a")[0] else ("line 2, column 9", "1e-300")
    assert refusal(content, feedback="subtracted") == (
        f"{place}: {written} divided by a0 is smaller than float64 holds (about 4.9e-324), and not 0."
    )


def test_half_of_the_smallest_number_vanishes_and_more_does_not(refusal, imported):
    assert "smaller than float64 holds" in refusal("b 1.0 0x1p-1074\na 2\n")
    assert imported("b 1.0 0x1p-1073\na 3\n").filter.factors[0].b[1] == 2.0**-1074


def test_what_overflows_in_the_division_by_a0_is_refused(refusal):
    assert "larger than float64 holds" in refusal("b 1e300\na 1e-300\n")


NAMES = "b0, b1, b2, a0, a1, a2 or -"
WRONG_COLUMNS = {
    "b0,b1,b2,a0,a1,c2": f'--columns b0,b1,b2,a0,a1,c2: "c2" is no column: {NAMES}.',
    "b0,b1,b2,a1,a1,a2": "--columns b0,b1,b2,a1,a1,a2: a1 is named 2 times.",
    "b0,b1,a1": "--columns b0,b1,a1: no column is b2 or a2. A section has b0, b1, b2, a1 and a2, and a0 or not.",
    "": f'--columns : "" is no column: {NAMES}.',
    "b0,b1,b2,a1,a2": "line 1, column 1: this row has length 6, not 5, the number of the columns b0,b1,b2,a1,a2.",
}


@pytest.mark.parametrize(("columns", "expected"), WRONG_COLUMNS.items())
def test_columns_that_are_wrong(columns, expected, refusal):
    found = refusal("0.5 1 0.25 1 -1.8 0.9025\n", columns=columns)
    assert found.partition(" Did you mean")[0] == expected


@pytest.mark.parametrize(
    ("content", "columns", "expected"),
    [
        ("b0,b1,b2,a1,a2\n1.0,0,0,0,0\n", "b0,b1,b2,a2,a1",
         ("--columns b0,b1,b2,a2,a1: the file names its columns otherwise, b0,b1,b2,a1,a2. Leave --columns out, or the line of "
         "names.")),
        ("b 1.0\n", "b", "--columns b: the file has lists of b and of a, and no columns. Leave it out."),
        ("1.0 2 3\n4 5 6\n", "b", "line 2, column 1: --columns b takes one list, and this is a second row of numbers."),
        ("[1.0, 2, 3, 4, 5, 6, 7]", "b0,b1,b2,a1,a2",
         "the file has one list, of length 7, which is no multiple of the 5 columns b0,b1,b2,a1,a2."),
    ],
)
def test_columns_that_do_not_go_with_the_file(content, columns, expected, refusal):
    assert refusal(content, columns=columns) == expected


def test_columns_as_the_file_names_them_may_be_stated_too(imported):
    assert imported("b0,b1,b2,a1,a2\n1.0,0,0,0,0\n", columns="b0,b1,b2,a1,a2").filter.order == 0


# Codes


ONLY_INTEGERS = (
    "the file has integers only. If they are codes, state their word, for instance --word Q2.14: a code is the value times "
    "2^14. If they are the values themselves, write one of them with a point: 1.0."
)


@pytest.mark.parametrize("content", [
    "1 2 1 1 0 0\n", "b 1 2 1\n", '{"b": [1, 2]}', "int b[] = {1, 2, 1};", "{{1, 2, 1, 0, 0}}",
])
def test_integers_need_a_word_or_a_point(content, refusal, imported):
    assert refusal(content) == ONLY_INTEGERS
    assert imported(content.replace("2", "2.0")).filter.order > 0


def test_codes_of_sections_stay_codes(imported):
    found = imported("1899,-3798,1899,4096,-7807,3733\n", word="Q4.12")
    assert found.filter == Filter.from_codes([[1899, -3798, 1899, 4096, -7807, 3733]], "Q4.12", rate=RATE)
    assert found.notes[1] == "word: Q4.12, the value of a code c is c / 4096, as asked"


def test_short_lists_of_codes_are_a_section(imported):
    found = imported("b 100 200\n", word="Q1.15")
    assert found.filter == Filter.from_codes([[100, 200, 0, 0, 0]], "Q1.15", rate=RATE)


VALUES = (
    'codes: written as their values, since a preset holds only sections as codes, and only within their word; '
    'coefficients = "Q1.15" under [format] makes them codes again'
)


def test_long_lists_of_codes_become_values(imported):
    found = imported("b 100 -200 300 0x8000\n", word="Q1.15")
    values = [Fraction(code, 1 << 15) for code in (100, -200, 300, -32768)]
    assert found.filter == Filter.from_coefficients(values, rate=RATE)
    assert found.filter.codes is None
    assert found.notes[-1] == VALUES


def test_a_code_without_its_negative_becomes_a_value(imported):
    found = imported("100,0,0,20000,-32768\n", word="Q1.15", feedback="added")
    row = [Fraction(code, 1 << 15) for code in (100, 0, 0, 32768, -20000, 32768)]
    assert found.filter == Filter.from_sections([row], rate=RATE)
    assert found.notes[-1] == VALUES


@pytest.mark.parametrize(
    ("content", "word", "expected"),
    [
        ("1899,-3798,1899.5,4096,-7807,3733\n", "Q4.12",
         "line 1, column 12: 1899.5 is no integer; a code of Q4.12 is one. Leave --word out for values."),
        ("1899,-3798,32768,4096,-7807,3733\n", "Q4.12",
         "line 1, column 12: 32768 is no code of Q4.12, which has -32768 to 32767."),
        ("1899,-3798,-32769,4096,-7807,3733\n", "Q4.12",
         "line 1, column 12: -32769 is no code of Q4.12, which has -32768 to 32767."),
        ("1899,-3798,0x10000,4096,-7807,3733\n", "Q4.12",
         "line 1, column 12: 65536 is no code of Q4.12, which has -32768 to 32767."),
        ("1899,-3798,-0x8001,4096,-7807,3733\n", "Q4.12",
         "line 1, column 12: -32769 is no code of Q4.12, which has -32768 to 32767."),
        ("9,-8,7,4095,-7807,3733\n", "Q4.12",
         "line 1, column 8: a0 is 4095; among codes of Q4.12 it can only be 4096, the code of 1."),
        ("9,-8,7,32767,-7807,3733\n", "Q1.15",
         ("line 1, column 8: a0 is 32767; among codes of Q1.15 it can only be 32768, the code of 1. The word does not hold 1: "
         "leave a0 out, in the file or by a - in --columns.")),
        ("9,-8,7,1,-7,3\n", "4.12",
         "word is '4.12'; a word is written like \"Q4.12\": integer bits with the sign, then fraction bits."),
    ],
)
def test_codes_that_do_not_go_with_their_word(content, word, expected, refusal):
    assert refusal(content, word=word) == expected
