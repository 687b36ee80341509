"""Whatever a file holds: a filter that a preset gives back, or an error that says why not; and each format in the round."""

import io
import json
import zipfile

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from imported_tables import RATE, ROWS

from streamhost.errors import RequestError
from streamhost.filters import Filter
from streamhost.presets import parse_preset
from streamhost.presets.importing import FEEDBACKS, import_filter
from streamhost.presets.writing import preset_text

COLUMNS = ("b0", "b1", "b2", "a0", "a1", "a2")


@pytest.fixture(scope="module")
def file(tmp_path_factory):
    return tmp_path_factory.mktemp("imports") / "file"


# In the round


def as_text(rows):
    return "\n".join(",".join(map(repr, row)) for row in rows)


def as_hexadecimal_text(rows):
    return "\n".join(" ".join(value.hex() for value in row) for row in rows)


def as_c(rows):
    return "const double t[][6] = {" + ",".join("{" + ",".join(map(repr, row)) + "}" for row in rows) + "};"


def as_json(rows):
    return json.dumps({"sos": rows})


def as_npz(rows):
    stream = io.BytesIO()
    np.savez(stream, sos=np.array(rows))
    return stream.getvalue()


# No quotient of two of them vanishes in float64.
numbers = st.one_of(st.sampled_from([0.0, 1.0, -0.1]), st.floats(-1e100, 1e100).filter(lambda value: abs(value) > 1e-100))
leading = numbers.filter(bool)
tables = st.lists(st.tuples(numbers, numbers, numbers, leading, numbers, numbers), min_size=1, max_size=4)


def written(file, content):
    file.write_bytes(content if isinstance(content, bytes) else content.encode())
    return file


@pytest.mark.parametrize("write", [as_text, as_hexadecimal_text, as_c, as_json, as_npz])
@settings(max_examples=40)
@given(tables, st.permutations(COLUMNS), st.sampled_from(FEEDBACKS))
def test_sections_come_back_bit_for_bit(write, file, rows, columns, feedback):
    """The rows are written in any order of columns and in either sign."""
    sign = -1.0 if feedback == "added" else 1.0
    shuffled = []
    for row in rows:
        by_name = dict(zip(COLUMNS, row, strict=True))
        by_name |= {"a1": sign * by_name["a1"], "a2": sign * by_name["a2"]}
        shuffled.append([by_name[name] for name in columns])
    written(file, write(shuffled))
    found = import_filter(file, rate=RATE, columns=",".join(columns), feedback=feedback)
    assert found.filter == Filter.from_sections(rows, rate=RATE)
    assert parse_preset(preset_text(found.filter, comments=found.notes)).filter == found.filter


def lists_as_text(b, a):
    return f"b = {', '.join(map(repr, b))}\na = {', '.join(map(repr, a))}\n"


def lists_as_c(b, a):
    return f"double b[] = {{{', '.join(map(repr, b))}}}, a[] = {{{', '.join(map(repr, a))}}};"


def lists_as_json(b, a):
    return json.dumps({"b": b, "a": a})


def lists_as_npz(b, a):
    stream = io.BytesIO()
    np.savez_compressed(stream, b=np.array(b), a=np.array(a))
    return stream.getvalue()


lists = st.builds(lambda first, rest: [first, *rest], leading, st.lists(numbers, max_size=12))


@pytest.mark.parametrize("write", [lists_as_text, lists_as_c, lists_as_json, lists_as_npz])
@settings(max_examples=40)
@given(lists, lists)
def test_lists_come_back_bit_for_bit(write, file, b, a):
    found = import_filter(written(file, write(b, a)), rate=RATE, feedback="subtracted").filter
    wanted = Filter.from_coefficients(b, a, rate=RATE)
    # Three numbers in b and in a are a section, and a section keeps the zeros at its end.
    assert [stripped(f.b) for f in found.factors] == [stripped(f.b) for f in wanted.factors]
    assert [stripped(f.a) for f in found.factors] == [stripped(f.a) for f in wanted.factors]
    assert parse_preset(preset_text(found)).filter == found


def stripped(values):
    values = list(values)
    while len(values) > 1 and values[-1] == 0:
        values.pop()
    return values


def integers_as_text(rows):
    return "\n".join(" ".join(map(str, row)) for row in rows)


def integers_as_c(rows):
    return "const int16_t t[][5] = {" + ",".join("{" + ",".join(f"{v & 0xFFFF:#x}" for v in row) + "}" for row in rows) + "};"


def integers_as_json(rows):
    return json.dumps(rows)


def integers_as_npz(rows):
    stream = io.BytesIO()
    np.savez(stream, sos=np.array(rows, np.int16))
    return stream.getvalue()


@pytest.mark.parametrize("write", [integers_as_text, integers_as_c, integers_as_json, integers_as_npz])
@settings(max_examples=40)
@given(st.lists(st.lists(st.integers(-(2**15), 2**15 - 1), min_size=5, max_size=5), min_size=1, max_size=4),
       st.sampled_from(["Q1.15", "Q2.14", "Q-2.18"]))
def test_codes_come_back_bit_for_bit(write, file, rows, word):
    found = import_filter(written(file, write(rows)), rate=RATE, word=word, feedback="subtracted").filter
    assert found == Filter.from_codes(rows, word, rate=RATE)
    assert parse_preset(preset_text(found)).filter == found


# Whatever it holds


PIECES = [
    "b0,b1,b2,a1,a2\n", "0.5", "1", "-1.8e0", "0x1p-3", "0x7FFF", "1e400", "nan", "b = ", "a: ", "\n", ",", ";", " ", "{", "}",
    "[", "]", "[[", "]]", '{"sos": ', '{"b": ', '"a": ', "double b[] = {", "float t[2][6] = {{", "};", "0.1f", "/*", "*/", "//",
    "#", "%", '"', "'", "\\", "(", "\N{MINUS SIGN}", "\r", "\ufeff", "1 2 1 1 -1.8 0.9025\n", "\x1b[2J", "\u2028",
]
pieces = st.one_of(st.sampled_from(PIECES), st.text(max_size=3))
texts = st.lists(pieces, max_size=30).map(lambda parts: "".join(parts).encode())
WHOLE = [as_text(ROWS).encode(), as_c(ROWS).encode(), as_json(ROWS).encode(), as_npz(ROWS),
         lists_as_npz([1.0], [1.0, 0.5]), lists_as_text([1.0, 2.0], [1.0, 0.5]).encode()]
asked = st.fixed_dictionaries({
    "columns": st.sampled_from([None, None, "b", "b0,b1,b2,a1,a2", "-,b0,b1,b2,a1,a2"]),
    "feedback": st.sampled_from([None, *FEEDBACKS]), "word": st.sampled_from([None, None, "Q1.15", "Q2.14"]),
})


def filter_or_error(file, content, asked):
    written(file, content)
    try:
        found = import_filter(file, rate=RATE, **asked)
    except RequestError as error:
        assert str(error).startswith(f"{file}: ")
        assert str(error).isprintable(), str(error)
        return
    assert all(note.isprintable() for note in found.notes)
    assert parse_preset(preset_text(found.filter, comments=found.notes)).filter == found.filter


@given(texts, asked)
def test_any_pieces_of_text(file, content, asked):
    filter_or_error(file, content, asked)


@given(st.binary(max_size=100), st.sampled_from([b"", b"PK\x03\x04", b"\x93NUMPY", b"{", b"[", b"\xef\xbb\xbf"]), asked)
def test_any_bytes(file, content, start, asked):
    filter_or_error(file, start + content, asked)


@given(st.sampled_from(WHOLE), st.data(), asked)
def test_whole_files_with_a_hole(file, content, data, asked):
    start = data.draw(st.integers(0, len(content)))
    filling = data.draw(st.binary(max_size=4))
    length = data.draw(st.integers(0, 12))
    filter_or_error(file, content[:start] + filling + content[start + length :], asked)


@given(st.binary(max_size=200), st.sampled_from(["sos", "b", "z"]), st.data(), asked)
def test_archives_whose_arrays_are_damaged(file, junk, name, data, asked):
    """The archive itself is sound, so that what the arrays say of themselves is met."""
    stream = io.BytesIO()
    np.save(stream, np.array(ROWS))
    array = stream.getvalue()
    start = data.draw(st.integers(0, len(array)))
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w") as archive:
        archive.writestr(f"{name}.npy", array[:start] + junk + array[start + data.draw(st.integers(0, len(junk))) :])
    filter_or_error(file, stream.getvalue(), asked)
