"""Filters from the integers that firmware holds."""

import numpy as np
import pytest
from levels import decibels

from streamhost.errors import FilterError
from streamhost.filters import Codes, Filter

# ITU-T G.729 (03/96) clause 3.1, eq. (1), pre-processing high-pass, and the integers of its C code (as quoted).
DECIMALS = ([0.46363718, -0.92724705, 0.46363718], [1, -1.9059465, 0.9114024])
ROW = [1899, -3798, 1899, 4096, -7807, 3733]
RESPONSE_DB = {  # Hz: decimals, Q4.12; computed from the same source, 3 decimals
    20: (-35.853, -33.351),
    50: (-17.718, -17.276),
    60: (-14.536, -14.218),
    100: (-7.819, -7.746),
    140: (-6.271, -6.264),
    200: (-6.021, -6.027),
    300: (-6.103, -6.108),
    1000: (-6.254, -6.254),
    3400: (-6.27, -6.271),
}


def test_codes_are_the_decimals_rounded_to_q12():
    f = Filter.from_codes([ROW], "Q4.12", rate=8000)
    given = np.array(DECIMALS).reshape(-1)
    section = f.sections()[0]
    assert list(np.rint(given * 4096)) == ROW
    assert section.b == (1899 / 4096, -3798 / 4096, 1899 / 4096)
    assert section.a == (1.0, -7807 / 4096, 3733 / 4096)
    assert f.codes == Codes((tuple(ROW),), "Q4.12")


@pytest.mark.parametrize("column", [0, 1])
def test_the_published_high_pass_in_decimals_and_in_codes(column):
    if column == 0:
        f = Filter.from_coefficients(*DECIMALS, rate=8000)
    else:
        f = Filter.from_codes([ROW], "Q4.12", rate=8000)
    wanted = [row[column] for row in RESPONSE_DB.values()]
    # The table has three decimals.
    assert decibels(f.response(list(RESPONSE_DB))) == pytest.approx(wanted, abs=0.0005)


def test_the_codes_leave_exactly_nothing_at_zero_hertz_and_the_decimals_do():
    assert Filter.from_codes([ROW], "Q4.12", rate=8000).response(0.0) == 0
    at_zero = decibels(Filter.from_coefficients(*DECIMALS, rate=8000).response(0.0))
    assert at_zero == pytest.approx(-46.011, abs=0.0005)


def test_five_columns_leave_a0_out():
    five = Filter.from_codes([ROW[:3] + ROW[4:]], "Q4.12", rate=8000)
    assert five == Filter.from_codes([ROW], "Q4.12", rate=8000)


def test_a_word_that_cannot_hold_one_takes_five_columns():
    five = Filter.from_codes(np.array([[100, 0, 0, -20000, 9000]]), "Q1.15", rate=8000)
    assert five.codes == Codes(((100, 0, 0, 32768, -20000, 9000),), "Q1.15")
    with pytest.raises(FilterError, match=r"codes\[0\]\[3\] .* cannot hold 1 .* five columns"):
        Filter.from_codes([[100, 0, 0, 32767, -20000, 9000]], "Q1.15", rate=8000)


def test_words_without_integer_bits_are_words():
    f = Filter.from_codes([[3, 0, 0, -1, 0]], "Q-1.4", rate=8000)
    assert f.sections()[0].b == (3 / 16, 0.0, 0.0)
    assert f.sections()[0].a == (1.0, -1 / 16, 0.0)


@pytest.mark.parametrize(
    ("codes", "word", "message"),
    [
        ([], "Q4.12", "codes is empty"),
        ([[1, 2, 3]], "Q4.12", r"codes\[0\] has 3 codes; every row is six"),
        ([ROW, ROW[:3] + ROW[4:]], "Q4.12", r"codes\[1\] has 5 codes"),
        ([[1899.0, *ROW[1:]]], "Q4.12", r"codes\[0\]\[0\] is 1899\.0, which is not an integer"),
        ([[True, *ROW[1:]]], "Q4.12", r"codes\[0\]\[0\] is True, which is not an integer"),
        ([[32768, *ROW[1:]]], "Q4.12", r"codes\[0\]\[0\] is 32768.*-32768 to 32767 are allowed"),
        ([[*ROW[:3], 4095, *ROW[4:]]], "Q4.12", r"a0 = 4095.*code of 1, which is 4096"),
        ([ROW], "4.12", "word is '4.12'; a word is written like"),
        ([ROW], 12, "word is 12; a word is written like"),
        ([ROW], "Q40.25", "has 65 bits; a word has 2 to 64"),
        ([ROW], "Q1.0", "has 1 bits; a word has 2 to 64"),
        (7, "Q4.12", "codes is 7, which is not a list"),
    ],
)
def test_what_is_no_table_of_codes_is_refused(codes, word, message):
    with pytest.raises(FilterError, match=message):
        Filter.from_codes(codes, word, rate=8000)


def test_codes_join_codes_of_the_same_word_and_nothing_else():
    f = Filter.from_codes([ROW], "Q4.12", rate=8000)
    assert Filter.cascade([f, f]).codes == Codes((tuple(ROW), tuple(ROW)), "Q4.12")
    other = Filter.from_codes([[1, 0, 0, 0, 0]], "Q2.14", rate=8000)
    for companion in (other, Filter.from_coefficients([1], rate=8000)):
        with pytest.raises(FilterError, match="only beside codes of the same word"):
            Filter.cascade([f, companion])
