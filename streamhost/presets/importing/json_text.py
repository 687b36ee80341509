"""Coefficients in JSON: rows of sections, lists of b and a, or one list."""

import json
from collections.abc import Sequence

from streamhost.errors import RequestError
from streamhost.presets.importing.literals import literal
from streamhost.presets.importing.stated import Flat, Lists, Number, Numbers, Reading, Rows, checked_count, refused, way_stated
from streamhost.presets.mistakes import one_line

WAYS = {"sos": ("sos",), "sections": ("sections",), "b and a": ("b", "a")}


class _Literal(str):
    """A number as it was written."""

    __slots__ = ()


def read_json(text: str) -> Reading:
    """What the document states. RequestError with line and column where it is no JSON, else with the place in it."""
    document = _document(text)
    if isinstance(document, list):
        has_rows = any(isinstance(entry, list) for entry in document)
        return Reading(_rows(document, "") if has_rows else Flat(_numbers(document, "")))
    if not isinstance(document, dict):
        raise RequestError("the file is one value of JSON, and neither a list nor an object.")
    way, notes = way_stated(document, WAYS, "key")
    if way != "b and a":
        return Reading(_rows(document[way], way), notes)
    a = _numbers(document["a"], "a") if "a" in document else ()
    return Reading(Lists(((_numbers(document["b"], "b"), a),)), notes)


def _document(text: str) -> object:
    try:
        return json.loads(text, parse_float=_Literal, parse_int=_Literal, parse_constant=_no_constant,
                          object_pairs_hook=_object)
    except json.JSONDecodeError as error:
        raise refused(f"line {error.lineno}, column {error.colno}", f"this is no JSON: {error.msg.lower()}.") from None
    except RecursionError:
        raise RequestError("the file has lists or objects too deep inside each other.") from None


def _no_constant(name: str) -> object:
    raise RequestError(f"the file has the value {name}, and a coefficient is finite.")


def _object(pairs: Sequence[tuple[str, object]]) -> dict[str, object]:
    members = dict(pairs)
    if len(members) < len(pairs):
        names = [name for name, _ in pairs]
        twice = next(name for name in names if names.count(name) > 1)
        raise RequestError(f"the file states the key {one_line(twice)!r} twice.")
    return members


def _rows(value: object, name: str) -> Rows:
    if not isinstance(value, list) or not value:
        raise refused(name, "this is a list of rows, one for each section, each a list of numbers.")
    return Rows(tuple(_numbers(row, f"{name}[{i}]") for i, row in enumerate(value)))


def _numbers(value: object, place: str) -> Numbers:
    if not isinstance(value, list) or not value:
        raise refused(place or "the list", "a list of numbers belongs here.")
    checked_count(len(value))
    return tuple(_number(entry, f"{place}[{i}]") for i, entry in enumerate(value))


def _number(value: object, place: str) -> Number:
    if not isinstance(value, _Literal):
        raise refused(place, "a number belongs here.")
    return literal(value, place)
