"""Import of coefficients in lines of text."""

import pytest
from imported_tables import RATE, ROWS, SECTIONS, imported, refusal

from streamhost.errors import MachineError, RequestError
from streamhost.filters import Filter
from streamhost.presets.importing import import_filter

__all__ = ["imported", "refusal"]  # fixtures


@pytest.mark.parametrize(
    "content",
    [
        "0.5,1,0.5,1,-1.8,0.9025\n1,-2,1,1,0.1,0.2\n",
        "0.5, 1.0, 0.5, 1.0, -1.8, 0.9025\n1,-2,1,1,.1,2e-1",
        "0.5;1;0.5;1;-1.8;0.9025;\n1;-2;1;1;0.1;0.2;\n",
        "0.5 1 0.5\t1 -1.8 0.9025\n  1 -2 1 1 0.1 0.2\n",
        '"0.5","1","0.5","1","-1.8","0.9025"\n"1","-2","1","1","0.1","0.2"\n',
        "# a comment\n\n% another\n// and another\n0.5 1 0.5 1 -1.8 0.9025 # here too\n\n1 -2 1 1 0.1 0.2\n",
        "\N{BYTE ORDER MARK}0.5,1,0.5,1,-1.8,0.9025\r\n1,-2,1,1,0.1,0.2\r\n",
        "0.5,1,0.5,1,\N{MINUS SIGN}1.8,0.9025\n1,\N{MINUS SIGN}2,1,1,0.1,0.2\n",
        "b0 b1 b2 a0 a1 a2\n[0.5, 1, 0.5, 1, -1.8, 0.9025]\n[1, -2, 1, 1, 0.1, 0.2]\n",
        "0x1p-1 1 0.5 1 -1.8 0.9025\n1 -2 1 1 0.1 0.2\n",
    ],
)
def test_rows_of_sections(content, imported):
    assert imported(content).filter == SECTIONS


def test_a_line_of_names_states_the_order(imported):
    found = imported('A0,a1,a2,"b0",B1,b2\n1,-1.8,0.9025,0.5,1,0.5\n1,0.1,0.2,1,-2,1\n')
    assert found.filter == SECTIONS
    assert found.notes[0] == "columns: a0,a1,a2,b0,b1,b2, as the file names them"


def test_five_columns_leave_a0_out(imported):
    found = imported("0.5,1,0.5,-1.8,0.9025\n1,-2,1,0.1,0.2\n")
    assert found.filter == SECTIONS
    assert found.notes[:2] == (
        "columns: b0,b1,b2,a1,a2, the usual order, since the file names none (--columns states another)",
        "a0: not in the file, taken as 1",
    )


@pytest.mark.parametrize(
    "content",
    ["b = [0.25, 0.5]\na = [2, -1.5]\n", "b 0.25 0.5\na 2 -1.5", "b,0.25,0.5\na,2,-1.5\n", "B: 0.25; 0.5;\nA: 2; -1.5;\n",
     "  b=0.25,0.5;\n\n  a=2,-1.5;\n"],
)
def test_lists_of_b_and_a(content, imported):
    found = imported(content, feedback="subtracted")
    assert found.filter == Filter.from_coefficients([0.25, 0.5], [2, -1.5], rate=RATE)
    assert found.notes == ((f"a0: divided out, 2 at line {content[:content.lower().index('a')].count(chr(10)) + 1}, "
                           f"column {content.splitlines()[-1].index('2') + 1}"), "feedback: subtracted, as asked")


def test_several_pairs_of_b_and_a_stand_in_cascade(imported):
    found = imported("b 1.0 0.5\na 1 -0.9\nb 1 2 3 4\nb 0.5 1 0.5\na 1 -1.8 0.9025\n", feedback="subtracted")
    parts = ([1, 0.5], [1, -0.9]), ([1, 2, 3, 4], [1]), ([0.5, 1, 0.5], [1, -1.8, 0.9025])
    assert found.filter == Filter.cascade(Filter.from_coefficients(b, a, rate=RATE) for b, a in parts)


def test_a_finite_response_needs_no_feedback(imported):
    found = imported("b = 0.25, 0.5, 0.25\n")
    assert found.filter == Filter.from_coefficients([0.25, 0.5, 0.25], rate=RATE)
    assert found.notes == ()


@pytest.mark.parametrize("content", ["0.25\n0.5\n0.25\n0.0625\n", "0.25 0.5 0.25 0.0625\n"])
def test_one_list_is_b_where_that_is_stated(content, imported):
    found = imported(content, columns="b")
    assert found.filter == Filter.from_coefficients([0.25, 0.5, 0.25, 0.0625], rate=RATE)
    assert found.notes == ("columns: b, the coefficients of a finite response, as asked",)


def test_one_number_a_line_is_sections_where_the_columns_are_stated(imported):
    content = "".join(f"{number}\n" for row in ROWS for number in row)
    assert imported(content, columns="b0,b1,b2,a0,a1,a2").filter == SECTIONS


WRONG = [
    ("", "the file has no numbers in it."),
    ("# nothing\n\n", "the file has no numbers in it."),
    ("b0,b1,b2,a1,a2\n", "the file has no numbers in it, only the names of columns."),
    ("0.5,1,0.5,1,-1.8,0.9\n0.5,1,0.5,1,-1.8,O.9\n",
     'line 2, column 18: "O.9" is no number. Decimals have a point: 0.5.'),
    ("0,5;1;0,5;1;-1,8;0,9\n", 'line 1, column 1: "0,5" is no number. Decimals have a point: 0.5.'),
    ("0.5,,0.5,1,-1.8,0.9\n", 'line 1, column 5: "" is no number. Decimals have a point: 0.5.'),
    ("0.5 1 0.5 1 nan 0\n", 'line 1, column 13: "nan" is no number. Decimals have a point: 0.5.'),
    ("0.5 1 0.5 1 1e400 0\n", "line 1, column 13: 1e400 is larger than float64 holds (about 1.8e308)."),
    ("0.5 1 0.5 1 1e-400 0\n", "line 1, column 13: 1e-400 is smaller than float64 holds (about 4.9e-324), and not 0."),
    ("0.5 1 0.5 1 " + "9" * 401, "line 1, column 13: this number has 401 characters; at most 400 are read."),
    ("0.5 1 0.5 1 " + "9" * 400,
     f"line 1, column 13: {'9' * 56} ... is larger than float64 holds (about 1.8e308)."),
    ("\u0663 1 0.5 1 0 0\n", 'line 1, column 1: "\u0663" is no number. Decimals have a point: 0.5.'),
    ("1 0.5 1\n", ("line 1, column 1: this row has length 3; a section is a row of six, b0,b1,b2,a0,a1,a2, or of five "
                  "without a0. State --columns for any other.")),
    ("0.5,1,0.5,1,-1.8,0.9\n 1,2,1\n", ("line 2, column 2: this row has length 3, not 6, the number of the columns "
                                       "b0,b1,b2,a0,a1,a2.")),
    ("0.5\n1\n", ("the file has one list, of length 2, and does not say of what. State --columns b0,b1,b2,a0,a1,a2 (in its "
                 "order, without a0 where it is left out) for sections one after the other, or --columns b for the "
                 "coefficients of a finite response.")),
    ("b0,b1,b3,a1,a2\n1,2,3,4,5.5\n", ('line 1, column 7: "b3" is the name of no column: b0, b1, b2, a0, a1 or a2; - '
                                      "is one that is not read.")),
    ("b0,b1,b1,a1,a2\n1,2,3,4,5.5\n", "the line of column names: b1 is named 2 times."),
    ("b0,b1,a1\n1,2,3.5\n", ("the line of column names: no column is b2 or a2. A section has b0, b1, b2, a1 and a2, and a0 "
                            "or not.")),
    ("2 2 2 0.0 0 0\n", "line 1, column 7: a0 is 0, and everything is divided by it."),
    ("b 1.0\na 0 1\n", "line 2, column 3: a0 is 0, and everything is divided by it."),
    ("a 1.0\nb 1.0\n", "line 1: this line of a has no line of b of its own before it."),
    ("b 1.0\na 1 0.5\na 1 0.5\n", "line 3: this line of a has no line of b of its own before it."),
    ("b 1.0\n0.5 1\n", "line 2: this line begins with neither b nor a, as others here do: each list is one line."),
    ("b = []\n", "line 1: no numbers stand here."),
    (b"\xff\xfe1\x00", ("line 1: the file is no text in UTF-8: the byte 0xFF is none. Numbers are read from text and from "
                       "NumPy archives.")),
    (b"1 2\n3 \xb5", ("line 2: the file is no text in UTF-8: the byte 0xB5 is none. Numbers are read from text and from "
                     "NumPy archives.")),
    ("1\x1b[2J 2 3 4 5\n", 'line 1, column 1: "1\\x1b[2J" is no number. Decimals have a point: 0.5.'),
    ("1.5\n" * 20_001, "the file has more than 20000 numbers, which is more than a preset holds."),
    ("b" + " 1.5" * 20_001, "the file has more than 20000 numbers, which is more than a preset holds."),
    ("1 2 1 1 0 0.5\n" * 3334, "the file has more than 20000 numbers, which is more than a preset holds."),
    (" " * 1_000_001, "the file is larger than 1 MB, which no table of coefficients is."),
]


@pytest.mark.parametrize(("content", "expected"), WRONG, ids=range(len(WRONG)))
def test_what_is_wrong_in_a_text_is_told_with_its_place(content, expected, refusal):
    assert refusal(content) == expected


def test_as_many_numbers_as_a_preset_holds(imported):
    assert len(imported("b" + " 1.5" * 20_000).filter.factors[0].b) == 20_000


def test_a_file_that_is_not_there(tmp_path):
    with pytest.raises(RequestError, match=r"none: there is no such file\.$"):
        import_filter(tmp_path / "none", rate=RATE)
    for folder in (tmp_path, tmp_path / "file" / "inside"):
        (tmp_path / "file").touch()
        with pytest.raises(RequestError, match="this is a folder, or lies inside a file; a file is imported"):
            import_filter(folder, rate=RATE)
    with pytest.raises(RequestError, match=r"^'a\\x00b': no file has such a name\.$"):
        import_filter("a\0b", rate=RATE)
    with pytest.raises(MachineError, match="cannot read this file"):
        import_filter(tmp_path / ("x" * 300), rate=RATE)


@pytest.mark.parametrize("rate", [0.0, -1.0, float("nan"), float("inf")])
def test_a_rate_that_is_none(rate, tmp_path):
    with pytest.raises(RequestError, match=r"^rate is "):
        import_filter(tmp_path / "none", rate=rate)
