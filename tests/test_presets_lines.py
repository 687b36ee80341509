"""On which line each key of a TOML text stands; the reader of the standard library says what the keys are."""

import tomllib

import pytest
from hypothesis import given
from hypothesis import strategies as st

from streamhost.presets.lines import DEEPEST, LONGEST_KEY, scan, split_at_commas

TEXT = '''title = "a # that is no comment, [nor] a = b"   # a comment with key = 1
rate = 48000

[[filter]]
kind = "peak"
q = 1.0
[[filter]]
sections = [
  # rows
  [1, 2, 3],
  [
    4, 5,
    6 ],
]
[filter.inside]
deep = true

[structure]
form = """
several
lines = 1
"""
"quoted.key" = 1
[format]
state.word = "Q1.31"
state . rounding = 'floor'
product = { bits = 20, rounding = "half-up" }
tables = [ { a = 1 },
  { b = 2 } ]
'''

EXPECTED = {
    ("title",): 1,
    ("rate",): 2,
    ("filter",): 4,
    ("filter", 0): 4,
    ("filter", 0, "kind"): 5,
    ("filter", 0, "q"): 6,
    ("filter", 1): 7,
    ("filter", 1, "sections"): 8,
    ("filter", 1, "sections", 0): 10,
    ("filter", 1, "sections", 0, 2): 10,
    ("filter", 1, "sections", 1): 11,
    ("filter", 1, "sections", 1, 0): 12,
    ("filter", 1, "sections", 1, 2): 13,
    ("filter", 1, "inside"): 15,
    ("filter", 1, "inside", "deep"): 16,
    ("structure",): 18,
    ("structure", "form"): 19,
    ("structure", "quoted.key"): 23,
    ("format",): 24,
    ("format", "state"): 25,
    ("format", "state", "word"): 25,
    ("format", "state", "rounding"): 26,
    ("format", "product", "bits"): 27,
    ("format", "product", "rounding"): 27,
    ("format", "tables", 0, "a"): 28,
    ("format", "tables", 1, "b"): 29,
}


@pytest.mark.parametrize(("path", "line"), EXPECTED.items(), ids=str)
def test_headers_dotted_keys_inline_tables_and_lists_of_several_lines(path, line):
    assert scan(TEXT).at[path] == line


def test_nothing_inside_texts_and_comments_is_taken_for_a_key():
    keys = {path[0] for path in scan(TEXT).at}
    assert keys == set(tomllib.loads(TEXT))


def test_a_path_that_is_not_stated_stands_where_the_table_around_it_stands():
    lines = scan(TEXT)
    assert lines.line(("filter", 1, "kind")) == 7
    assert lines.line(("filter", 1, "sections", 1, 9)) == 11
    assert lines.line(("limits", "band_hz")) is None


def test_line_ends_of_both_kinds_count_alike():
    assert scan(TEXT.replace("\n", "\r\n")).at == scan(TEXT).at


@pytest.mark.parametrize("closing", ['"""', '""""', '"""""'])
def test_a_text_of_several_lines_may_end_in_quotes_of_its_own(closing):
    text = f'a = """x\n{closing}\nb = 1\n'
    assert tomllib.loads(text)["b"] == 1
    assert scan(text).at == {("a",): 1, ("b",): 3}


@pytest.mark.parametrize("opening", ["[", "{a = "])
def test_what_lies_too_deep_is_found_before_anything_reads_it(opening):
    allowed, refused = "\n\nx = " + opening * DEEPEST, "\n\nx = " + opening * (DEEPEST + 1)
    assert scan(allowed).too_deep is None
    assert scan(refused).too_deep is not None
    assert scan(refused).too_deep[0] == 3


def test_a_key_of_very_many_parts_is_found_before_anything_reads_it():
    assert scan("a." * (LONGEST_KEY - 1) + "b = 1").too_deep is None
    assert scan('"a,". b.' * LONGEST_KEY + "b = 1").too_deep == (1, f"a key of more than {LONGEST_KEY} parts.")
    assert scan("[" + "a." * LONGEST_KEY + "b]").too_deep is not None


@pytest.mark.parametrize("unit", ['"\\', '"""\\', "'''", '"', "'", "[[", "a.", "a = ", "{", '"a".', "]", "\\", ",\n"])
def test_hostile_repetitions_end(unit):
    scan(unit * (200_000 // len(unit)))


PIECES = [
    "a", "b", '"q.k"', "'l'", ".", " = ", "1", "2.5", "true", '"text # = ["', "'x'", '"""m\nn"""', "'''\n]'''",
    "[", "]", "[[a]]", "[b]", "[a.c]", "[[b.d]]", "{", "}", "{ a = 1, b = [2, 3] }", ", ", "\n", "\n\n", "# note = 1\n",
    "a = 1\n", "b.c = 2\n", "d = [1, [2,\n 3], { e = 4 }]\n", "\\", '"', "\r\n", "é", "\x00",
]
KEYS = ["k", "l", "m.n", "m.o", '"q.k"', "'r' . s", "u.v.w"]
VALUES = [
    "1", "'x'", '"""m\nn"""', "[1, [2,\n 3],\n]", "{ a = 1, b.c = [2, 3] }", "[{ d = 1 }, # note\n { e = [] }]", "{}",
]
statements = st.one_of(
    st.builds("{} = {}\n".format, st.sampled_from(KEYS), st.sampled_from(VALUES)),
    st.sampled_from(["[[t]]\n", "[t.below]\n", "[[t.beside]]\n", "[x]\n", "[ y . z ]\n", "# k = 1\n", "\r\n"]),
)
toml_like = st.one_of(
    st.lists(st.sampled_from(PIECES), max_size=30).map("".join), st.lists(statements, max_size=12).map("".join)
)


def leaves(value, path=()):
    if isinstance(value, dict):
        for key, entry in value.items():
            yield from leaves(entry, (*path, key))
    elif isinstance(value, list):
        for index, entry in enumerate(value):
            yield from leaves(entry, (*path, index))
    if path:
        yield path


@given(toml_like)
def test_every_key_that_the_reader_finds_has_a_line_and_every_line_a_key_that_the_reader_finds(text):
    lines = scan(text)
    try:
        table = tomllib.loads(text)
    except tomllib.TOMLDecodeError:
        return
    assert set(lines.at) == set(leaves(table))
    for path, line in lines.at.items():
        if isinstance(path[-1], str):
            assert path[-1] in text.replace("\r\n", "\n").split("\n")[line - 1]


@given(st.text(alphabet="ab=[]{}\"'\\#., \n\r1", max_size=60))
def test_the_scanner_takes_any_text(text):
    scan(text)


def test_commas_divide_only_outside_lists_tables_and_quotes():
    assert split_at_commas('a,[1,[2,3]],{ b = 1, c = 2 },"x,y",') == ["a", "[1,[2,3]]", "{ b = 1, c = 2 }", '"x,y"', ""]
