"""Coefficients in a NumPy archive: sos; b and a; or z, p and k. Arrays of numbers only, never pickled objects."""

import io
import re
import zipfile
import zlib
from collections.abc import Mapping
from math import prod
from typing import Any, Literal

import numpy as np
import numpy.typing as npt

from streamhost.errors import RequestError
from streamhost.presets.importing.stated import (
    MOST_NUMBERS,
    Lists,
    Numbers,
    Reading,
    Roots,
    Rows,
    numbered,
    refused,
    way_stated,
)
from streamhost.presets.mistakes import one_line

SIGNATURE = b"PK\x03\x04"
WAYS = {"sos": ("sos",), "b and a": ("b", "a"), "z, p and k": ("z", "p", "k")}
MAY_BE_COMPLEX = ("z", "p")
MOST_ARRAYS = 100
LARGEST_MEMBER = 1_000_000
MOST_ROOTS = 1000
"""Of zeros and of poles: as many as a preset holds."""

Array = npt.NDArray[Any]

DAMAGED = "this is no array of numbers as NumPy stores it, or a damaged one."

# Version 1 states the length of the description in two bytes, later ones in four.
_HEADER = re.compile(rb"\x93NUMPY(?:\x01\x00(?P<short>..)|[\x02\x03]\x00(?P<long>....))(?P<description>)", re.DOTALL)
_DESCRIPTION = re.compile(
    rb"\{'descr': '(?P<type>[<>|=]?[A-Za-z][A-Za-z0-9\[\]]{0,20})', 'fortran_order': (?P<fortran>True|False), "
    rb"'shape': \((?P<shape>(?:[0-9]{1,18},? ?){0,8})\), \} *\n"
)
_BROKEN = (zipfile.BadZipFile, zlib.error, EOFError, NotImplementedError, RuntimeError, ValueError, OSError)


def read_npz(content: bytes) -> Reading:
    """What the arrays of these names state; others are not even unpacked. RequestError for anything else."""
    try:
        with zipfile.ZipFile(io.BytesIO(content)) as archive:
            members = {info.filename.removesuffix(".npy"): info for info in archive.infolist()[:MOST_ARRAYS]}
            way, notes = way_stated(map(one_line, members), WAYS, "array")
            arrays = {name: _array(archive, members[name], name) for name in WAYS[way] if name in members}
    except RequestError:
        raise
    except _BROKEN:
        raise RequestError("the file begins like a NumPy archive and cannot be read as one; it is damaged or another kind of "
                           "archive.") from None
    return Reading(_stated(arrays, way), notes)


def _stated(arrays: Mapping[str, Array], way: str) -> Rows | Lists | Roots:
    if way == "sos":
        sos = _of_dimensions(arrays["sos"], 2, "sos")
        return Rows(tuple(numbered(row, f"sos[{i}]") for i, row in enumerate(sos.tolist())))
    if way == "b and a":
        return Lists(((_list(arrays["b"], "b"), _list(arrays["a"], "a") if "a" in arrays else ()),))
    missing = [name for name in WAYS[way] if name not in arrays]
    if missing:
        raise RequestError(f"the file has no array {' and '.join(missing)}: zeros and poles are three arrays, z, p and k.")
    factor = _of_dimensions(arrays["k"], 0, "k")
    return Roots(_roots(arrays["z"], "z"), _roots(arrays["p"], "p"), float(factor))


def _array(archive: zipfile.ZipFile, info: zipfile.ZipInfo, name: str) -> Array:
    with archive.open(info) as member:
        data = member.read(LARGEST_MEMBER + 1)
    if len(data) > LARGEST_MEMBER:
        raise refused(name, f"the array takes more than {LARGEST_MEMBER // 1_000_000} MB.")
    array = _of_bytes(data, name)
    if not np.all(np.isfinite(array)):
        raise refused(name, "the array has a value that is not finite.")
    return array


def _of_bytes(data: bytes, name: str) -> Array:
    """An array as NumPy stores it. Its description is matched and not evaluated; kind and size are checked first."""
    header = _HEADER.match(data)
    if header is None:
        raise refused(name, DAMAGED)
    start = header.start("description") + int.from_bytes(header["short"] or header["long"], "little")
    described = _DESCRIPTION.fullmatch(data[header.start("description") : start])
    if described is None:
        raise refused(name, DAMAGED)
    dtype = _checked_type(described["type"].decode("ascii"), name)
    shape = tuple(int(length) for length in re.findall(rb"[0-9]+", described["shape"]))
    most = MOST_ROOTS if name in MAY_BE_COMPLEX else MOST_NUMBERS
    if prod(shape) > most:
        raise refused(name, f"the array has {prod(shape)} numbers; at most {most} are read.")
    if len(data) - start != prod(shape) * dtype.itemsize:
        raise refused(name, DAMAGED)
    order: Literal["C", "F"] = "F" if described["fortran"] == b"True" else "C"
    array: Array = np.frombuffer(data, dtype, offset=start).reshape(shape, order=order)
    return array


def _checked_type(text: str, name: str) -> np.dtype[Any]:
    kind, longest = (r"[iufc]", 16) if name in MAY_BE_COMPLEX else (r"[iuf]", 8)
    found = re.fullmatch(rf"[<>|]{kind}([0-9]{{1,2}})", text)
    if found is None or int(found[1]) not in (1, 2, 4, 8, longest):
        complex_too = ", and complex numbers of two such" if name in MAY_BE_COMPLEX else ""
        raise refused(name, f"the array is of type {text}; integers and floats of up to 64 bits are read{complex_too}.")
    return np.dtype(text)


def _list(array: Array, name: str) -> Numbers:
    return numbered(_of_dimensions(array, 1, name).tolist(), name)


def _roots(array: Array, name: str) -> tuple[complex, ...]:
    return tuple(complex(root) for root in _of_dimensions(array, 1, name).tolist())


def _of_dimensions(array: Array, dimensions: int, name: str) -> Array:
    if array.ndim != dimensions or (array.size == 0 and name not in MAY_BE_COMPLEX):
        shape = {0: "one number", 1: "a list of numbers", 2: "a table with a row of six or five for each section"}
        raise refused(name, f"the array has the shape {array.shape}; it is {shape[dimensions]}.")
    return array
