"""Import of coefficients in JSON."""

import json

import pytest
from imported_tables import RATE, ROWS, SECTIONS, imported, refusal

from streamhost.filters import Filter

__all__ = ["imported", "refusal"]  # fixtures


@pytest.mark.parametrize("document", [{"sos": ROWS}, {"sections": ROWS}, ROWS])
@pytest.mark.parametrize("indent", [None, 2])
def test_rows_of_sections(document, indent, imported):
    assert imported(json.dumps(document, indent=indent)).filter == SECTIONS


def test_lists_of_b_and_a(imported):
    content = json.dumps({"b": [0.25, 0.5], "a": [2, -1.5]})
    assert imported(content, feedback="subtracted").filter == Filter.from_coefficients([0.25, 0.5], [2, -1.5], rate=RATE)
    assert imported('{"b": [0.25, 0.5]}').filter == Filter.from_coefficients([0.25, 0.5], rate=RATE)


def test_one_list_is_what_the_columns_say(imported):
    flat = json.dumps([number for row in ROWS for number in row])
    assert imported(flat, columns="b0,b1,b2,a0,a1,a2").filter == SECTIONS
    assert imported("[1.0, 0.5]", columns="b").filter == Filter.from_coefficients([1, 0.5], rate=RATE)


def test_what_is_not_read_is_told(imported):
    found = imported(json.dumps({"rate": 44100, "sos": ROWS, "name\n": "hum"}))
    assert found.filter == SECTIONS
    assert found.notes[0] == "not read: key rate, name\\n"


WRONG = [
    ('{"b": [1.0,\n 2.0,]}', "line 2, column 6: this is no JSON: "),
    ("[[1.0, 2.0], [", "line 1, column 15: this is no JSON: expecting value."),
    ("[" * 100_000, "the file has lists or objects too deep inside each other."),
    ('{"b": [NaN]}', "the file has the value NaN, and a coefficient is finite."),
    ('{"b": [-Infinity]}', "the file has the value -Infinity, and a coefficient is finite."),
    ('{"b": [1.0], "b": [2.0]}', "the file states the key 'b' twice."),
    ('{"c": [1.0]}', "the file has no key that states a filter: it states one, by sos, sections or b and a."),
    ('{"a": [1.0]}', "the file has no key that states a filter: it states one, by sos, sections or b and a."),
    ("{}", "the file has no key that states a filter: it states one, by sos, sections or b and a."),
    ('{"sos": [[1.0]], "b": [1.0]}',
     "the file has 2 filters, sos and b and a: it states one, by sos, sections or b and a."),
    ('{"sos": []}', "sos: this is a list of rows, one for each section, each a list of numbers."),
    ('{"sos": 5}', "sos: this is a list of rows, one for each section, each a list of numbers."),
    ('{"sos": [1.0]}', "sos[0]: a list of numbers belongs here."),
    ('{"sos": [[]]}', "sos[0]: a list of numbers belongs here."),
    ('{"sos": [[1, 2, 3, 1, 0.5, "0.5"]]}', "sos[0][5]: a number belongs here."),
    ('{"b": [true]}', "b[0]: a number belongs here."),
    ('{"b": [1, null]}', "b[1]: a number belongs here."),
    ('{"b": 1.0}', "b: a list of numbers belongs here."),
    ("[]", "the list: a list of numbers belongs here."),
    ("[[1.0], 2.0]", "[1]: a list of numbers belongs here."),
    ('{"b": [1e400]}', "b[0]: 1e400 is larger than float64 holds (about 1.8e308)."),
    ('{"b": [' + "9" * 5000 + "]}", "b[0]: this number has 5000 characters; at most 400 are read."),
    ('{"b": [' + "1.5," * 20_000 + "1.5]}", "the file has more than 20000 numbers, which is more than a preset holds."),
    ('{"sos": [[1, 2, 1.0]]}', ("sos[0][0]: this row has length 3; a section is a row of six, b0,b1,b2,a0,a1,a2, or of five "
                               "without a0. State --columns for any other.")),
]


@pytest.mark.parametrize(("content", "expected"), WRONG, ids=range(len(WRONG)))
def test_what_is_wrong_in_json_is_told_with_its_place(content, expected, refusal):
    # The first of them is told in the words of Python's own reader, which differ from one release to the next.
    found = refusal(content)
    assert found.startswith(expected) if expected.endswith(": ") else found == expected
