"""Import of coefficients in NumPy archives."""

import io
import zipfile

import numpy as np
import pytest
from imported_tables import RATE, ROWS, SECTIONS, imported, refusal

from streamhost.filters import Filter

__all__ = ["imported", "refusal"]  # fixtures


def archive(**arrays):
    stream = io.BytesIO()
    np.savez(stream, **arrays)
    return stream.getvalue()


def with_member(name, data, compression=zipfile.ZIP_STORED):
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w", compression) as file:
        file.writestr(name, data)
    return stream.getvalue()


def header(shape, dtype="<f8"):
    stream = io.BytesIO()
    np.lib.format.write_array_header_1_0(stream, {"descr": dtype, "fortran_order": False, "shape": shape})
    return stream.getvalue()


@pytest.mark.parametrize("layout", ["C", "F"])
def test_rows_of_sections(layout, imported):
    assert imported(archive(sos=np.array(ROWS, order=layout))).filter == SECTIONS


def test_a_compressed_archive(imported):
    stream = io.BytesIO()
    np.savez_compressed(stream, sos=np.array(ROWS))
    assert imported(stream.getvalue()).filter == SECTIONS


def test_single_precision_is_taken_as_it_is(imported):
    rows = np.array(ROWS, np.float32)
    assert imported(archive(sos=rows)).filter == Filter.from_sections(rows.astype(np.float64), rate=RATE)


def test_lists_of_b_and_a(imported):
    found = imported(archive(b=np.array([0.25, 0.5]), a=np.array([2.0, -1.5])), feedback="subtracted")
    assert found.filter == Filter.from_coefficients([0.25, 0.5], [2, -1.5], rate=RATE)
    assert imported(archive(b=np.array([0.25, 0.5]))).filter == Filter.from_coefficients([0.25, 0.5], rate=RATE)


def test_integers_are_codes(imported):
    rows = np.array([[1899, -3798, 1899, 4096, -7807, 3733]], np.int16)
    assert imported(archive(sos=rows), word="Q4.12").filter == Filter.from_codes(rows.tolist(), "Q4.12", rate=RATE)


@pytest.mark.parametrize(
    ("zeros", "poles"), [([1.0, -0.5], [0.9 + 0.1j, 0.9 - 0.1j]), ([], [0.5, 0.25]), ([0.0, 0.0], [0.5j, -0.5j])]
)
def test_zeros_and_poles(zeros, poles, imported):
    found = imported(archive(z=np.array(zeros, float), p=np.array(poles), k=0.25))
    assert found.filter == Filter.from_zeros_poles(zeros, poles, 0.25, rate=RATE)
    assert found.notes == ()


def test_as_many_as_a_preset_holds(imported):
    assert len(imported(archive(b=np.ones(20_000))).filter.factors[0].b) == 20_000
    assert imported(archive(z=np.zeros(0), p=np.full(1000, 0.5), k=1.0)).filter.order == 1000


@pytest.mark.parametrize("option", ["columns", "feedback", "word"])
def test_zeros_and_poles_need_nothing_stated(option, refusal):
    content = archive(z=np.zeros(0), p=np.array([0.5]), k=1.0)
    assert refusal(content, **{option: "subtracted"}) == (
        f"the file has zeros and poles, which need no --{option}. Leave it out."
    )


def test_what_is_not_read_is_told_and_not_even_unpacked(imported):
    found = imported(archive(sos=np.array(ROWS), extra=np.array([object()])))
    assert found.filter == SECTIONS
    assert found.notes[0] == "not read: array extra"


class Tells:
    """Makes a file when it is unpickled."""

    def __init__(self, file):
        self.file = file

    def __reduce__(self):
        return open, (str(self.file), "w")


def test_pickled_objects_are_refused_and_not_unpickled(refusal, tmp_path):
    file = tmp_path / "unpickled"
    assert refusal(archive(sos=np.array([[Tells(file)]], object))) == (
        "sos: the array is of type |O; integers and floats of up to 64 bits are read."
    )
    assert not file.exists()


NO_ARRAY = "sos: this is no array of numbers as NumPy stores it, or a damaged one."
DAMAGED = "the file begins like a NumPy archive and cannot be read as one; it is damaged or another kind of archive."
WRONG = [
    (b"PK\x03\x04", DAMAGED),
    (archive(sos=np.array(ROWS))[:-30], DAMAGED),
    (archive(sos=np.array(ROWS)).replace(np.float64(0.9025).tobytes(), bytes(8)), DAMAGED),
    (with_member("sos.npy", b"no array"), NO_ARRAY),
    (with_member("sos.npy", header((2, 6))), NO_ARRAY),
    (with_member("sos.npy", header((2, 6)) + bytes(97)), NO_ARRAY),
    (with_member("sos.npy", header((-2, 6))), NO_ARRAY),
    (with_member("sos.npy", header((1, 1), [("x", "<f8")]) + bytes(8)), NO_ARRAY),
    (with_member("sos.npy", header((1, 1), "<f3") + bytes(3)),
     "sos: the array is of type <f3; integers and floats of up to 64 bits are read."),
    (with_member("sos.npy", header((10**12, 6))), "sos: the array has 6000000000000 numbers; at most 20000 are read."),
    (with_member("sos.npy", bytes(10**8), zipfile.ZIP_DEFLATED), "sos: the array takes more than 1 MB."),
    (with_member("text.txt", b"0.5"), ("the file has no array that states a filter: it states one, by sos, b and a or z, p "
                                      "and k.")),
    (archive(x=np.zeros(6)), "the file has no array that states a filter: it states one, by sos, b and a or z, p and k."),
    (archive(sos=np.zeros((1, 6)), b=np.zeros(1)),
     "the file has 2 filters, sos and b and a: it states one, by sos, b and a or z, p and k."),
    (archive(z=np.zeros(1), k=1.0), "the file has no array p: zeros and poles are three arrays, z, p and k."),
    (archive(z=np.zeros(1)), "the file has no array p and k: zeros and poles are three arrays, z, p and k."),
    (archive(sos=np.zeros(6)),
     "sos: the array has the shape (6,); it is a table with a row of six or five for each section."),
    (archive(sos=np.zeros((0, 6))),
     "sos: the array has the shape (0, 6); it is a table with a row of six or five for each section."),
    (archive(b=np.zeros((1, 2))), "b: the array has the shape (1, 2); it is a list of numbers."),
    (archive(b=np.zeros(0)), "b: the array has the shape (0,); it is a list of numbers."),
    (archive(z=np.zeros(0), p=np.zeros(1), k=np.ones(1)), "k: the array has the shape (1,); it is one number."),
    (archive(b=np.array([1.0, np.nan])), "b: the array has a value that is not finite."),
    (archive(b=np.array([1j])),
     "b: the array is of type <c16; integers and floats of up to 64 bits are read."),
    (archive(b=np.array(["1.0"])), "b: the array is of type <U3; integers and floats of up to 64 bits are read."),
    (archive(b=np.array([True])), "b: the array is of type |b1; integers and floats of up to 64 bits are read."),
    (archive(z=np.zeros(0), p=np.array(["1"]), k=1.0), ("p: the array is of type <U1; integers and floats of up to 64 bits "
                                                       "are read, and complex numbers of two such.")),
    (archive(b=np.zeros(20_001)), "b: the array has 20001 numbers; at most 20000 are read."),
    (archive(z=np.zeros(1001), p=np.zeros(1001), k=1.0), "z: the array has 1001 numbers; at most 1000 are read."),
    (archive(sos=np.array([[1, 2, 1, 0.0, 0, 0]]) * 2), "sos[0][3]: a0 is 0, and everything is divided by it."),
    (archive(z=np.zeros(1), p=np.array([0.5j]), k=1.0),
     "poles[0] is 0.5j and its conjugate -0.5j is not among them as often; complex roots come in exactly conjugate pairs."),
    (b"\x93NUMPY\x01\x00", ("the file is a single NumPy array, which does not say what it is. Save it under its name, sos, in "
                           "an archive: numpy.savez(file, sos=array).")),
]


@pytest.mark.parametrize(("content", "expected"), WRONG, ids=range(len(WRONG)))
def test_what_is_wrong_in_an_archive_is_told(content, expected, refusal):
    assert refusal(content) == expected
