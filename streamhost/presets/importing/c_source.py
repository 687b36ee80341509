"""Coefficients in C: the numbers between the braces of an array. A scanner, which knows no more of C than that."""

import re
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from itertools import islice
from typing import TypeVar

from streamhost.errors import RequestError
from streamhost.presets.importing.literals import MOST_CHARACTERS, literal, single
from streamhost.presets.importing.stated import Flat, Lists, Number, Numbers, Reading, Rows, checked_count, refused
from streamhost.presets.mistakes import one_line

SINGLE, DOUBLE = "float32", "float64"
_REAL_TYPES = {"float": SINGLE, "float32_t": SINGLE, "double": DOUBLE, "float64_t": DOUBLE}

NOT_WORKED_OUT = "Numbers are read, with their sign and suffix; names, casts and expressions are not worked out."

MOST_TOKENS = 200_000

Item = TypeVar("Item")

_TOKEN = re.compile(
    r"(?P<blank>\s+|//[^\n]*|/\*(?:.*?\*/|.*)|\#(?:\\\r?\n|[^\n])*)"
    r"""|(?P<text>"(?:[^"\\\n]|\\.)*"?|'(?:[^'\\\n]|\\.)*'?)"""
    r"|(?P<number>\.?[0-9](?:[eEpP][+-]|[\w.])*)"
    r"|(?P<name>[^\W\d]\w*)"
    r"|(?P<mark>.)",
    re.DOTALL,
)
_WITH_SUFFIX = re.compile(
    r"(?P<integer>0[xX][0-9a-fA-F]+|[0-9]+)[uUlL]{0,3}"
    r"|(?P<real>0[xX][0-9a-fA-F.]+[pP][+-]?[0-9]+|[0-9.]+(?:[eE][+-]?[0-9]+)?)(?P<suffix>[fFlL]?)"
)


@dataclass(frozen=True)
class _Token:
    kind: str
    text: str
    place: str


@dataclass(frozen=True)
class _Array:
    """An array; `items` holds numbers, or tuples of numbers for rows."""

    name: str
    items: tuple[Number, ...] | tuple[Numbers, ...]
    place: str

    @property
    def role(self) -> str | None:
        """b or a, where the name is one of the two or ends in it."""
        end = self.name.lower().rpartition("_")[2]
        return end if end in ("a", "b") else None


def has_braces(text: str) -> bool:
    """Whether a brace stands outside comments and quotes: text that is no JSON and has one is C."""
    return any(match[0] == "{" for match in _TOKEN.finditer(text))


def read_c(text: str) -> Reading:
    """One array of rows or of numbers, or two called b and a. RequestError with line and column."""
    tokens = list(islice(_tokens(text), MOST_TOKENS + 1))
    if len(tokens) > MOST_TOKENS:
        raise RequestError(f"the file has more than {MOST_TOKENS} words of C, too many for a table of coefficients.")
    reader = _Reader(tokens)
    arrays = reader.arrays()
    stated = _stated(arrays)
    notes = [f"array: {one_line(array.name)}" for array in arrays if array.name]
    if reader.singles:
        notes.append(f"float32: rounded to it, as C does, were {reader.singles} numbers that it does not hold as written")
    return Reading(stated, tuple(notes))


def _stated(arrays: Sequence[_Array]) -> Rows | Flat | Lists:
    by_role = {array.role: array for array in arrays}
    if len(arrays) == 1 and arrays[0].role != "b":
        return _one(arrays[0])
    if len(arrays) <= 2 and "b" in by_role and len(by_role) == len(arrays) and by_role.keys() <= {"a", "b"}:
        return Lists(((_flat(by_role["b"]), _flat(by_role["a"]) if "a" in by_role else ()),))
    if not arrays:
        raise RequestError("the file has braces, and no array with its numbers between them, as in b[3] = {0.5, 1.0, 0.5}.")
    names = ", ".join(array.name or "one without a name" for array in arrays)
    raise RequestError(f"the file has {len(arrays)} arrays, {one_line(names)}. Leave one of them, or two, called b and a.")


def _one(array: _Array) -> Rows | Flat:
    rows = tuple(item for item in array.items if isinstance(item, tuple))
    return Rows(rows) if rows else Flat(_flat(array))


def _flat(array: _Array) -> Numbers:
    numbers = tuple(item for item in array.items if isinstance(item, Number))
    if len(numbers) < len(array.items):
        raise refused(array.place, f"the array {one_line(array.name)} has rows, and b and a are lists of numbers.")
    return numbers


def _tokens(text: str) -> Iterator[_Token]:
    """Every token but blanks and comments."""
    line, start = 1, 0
    for match in _TOKEN.finditer(text):
        if match.lastgroup != "blank":
            yield _Token(str(match.lastgroup), match[0], f"line {line}, column {match.start() - start + 1}")
        if "\n" in match[0]:
            line += match[0].count("\n")
            start = match.start() + match[0].rindex("\n") + 1


class _Reader:
    """Goes over the tokens once; `singles` counts the numbers that float32 changed."""

    def __init__(self, tokens: list[_Token]) -> None:
        self.tokens = tokens
        self.next = 0
        self.singles = 0

    def take(self) -> _Token:
        if self.next == len(self.tokens):
            raise refused(self.tokens[-1].place, "the file ends after this, inside the braces of an array.")
        self.next += 1
        return self.tokens[self.next - 1]

    def arrays(self) -> list[_Array]:
        """Every array that is given its values; a list in braces at the very beginning is one without a name."""
        found: list[_Array] = []
        declaration: list[_Token] = []
        while self.next < len(self.tokens):
            token = self.take()
            if token.text == "{" and (self.next == 1 or (declaration and declaration[-1].text == "=")):
                kind = next((_REAL_TYPES[part.text] for part in declaration if part.text in _REAL_TYPES), "")
                found.append(_Array(_declared(declaration), self.items(token, kind), token.place))
            elif token.text in (";", "{", "}"):
                declaration = []
            else:
                declaration.append(token)
        return found

    def items(self, opening: _Token, kind: str) -> tuple[Number, ...] | tuple[Numbers, ...]:
        """Numbers, or rows of numbers, up to the brace that closes `opening`."""
        if self.next < len(self.tokens) and self.tokens[self.next].text == "{":
            return self.separated(opening, lambda token: self.row(token, kind))
        return self.separated(opening, lambda token: self.number(token, kind))

    def row(self, token: _Token, kind: str) -> Numbers:
        if token.text != "{":
            raise refused(token.place, "a row in braces belongs here, as before it.")
        return self.separated(token, lambda inside: self.number(inside, kind))

    def separated(self, opening: _Token, read: Callable[[_Token], Item]) -> tuple[Item, ...]:
        """What `read` makes of each part between commas, of which one may follow the last part."""
        found: list[Item] = []
        token = self.take()
        while token.text != "}":
            found.append(read(token))
            checked_count(len(found))
            token = self.take()
            if token.text == ",":
                token = self.take()
            elif token.text != "}":
                raise refused(token.place, f'"{one_line(token.text)}" follows a number; , or }} does. {NOT_WORKED_OUT}')
        if not found:
            raise refused(opening.place, "nothing stands in these braces.")
        return tuple(found)

    def number(self, token: _Token, kind: str) -> Number:
        place, sign = token.place, ""
        if token.text in ("+", "-"):
            sign, token = token.text, self.take()
        is_short = token.kind == "number" and len(token.text) <= MOST_CHARACTERS
        parts = _WITH_SUFFIX.fullmatch(token.text) if is_short else None
        if parts is None:
            raise refused(place, f'"{one_line(sign + token.text)}" is no number. {NOT_WORKED_OUT}')
        digits = parts["integer"] or parts["real"]
        if parts["integer"] and len(digits) > 1 and digits[0] == "0" and digits[1] not in "xX":
            raise refused(place, f"{one_line(digits)} is octal in C, since it begins with 0; write it without the 0.")
        number = literal(sign + digits, place)
        if parts["suffix"] in ("f", "F"):
            return self.counted(number, single(number, sign + digits))
        if kind == SINGLE:
            return self.counted(number, single(number))
        return Number(float(number.value), place) if kind == DOUBLE else number

    def counted(self, written: Number, taken: Number) -> Number:
        self.singles += written.value != taken.value
        return taken


def _declared(declaration: Sequence[_Token]) -> str:
    """The name that is declared: what stands before the first [ behind the last comma, else the last name of all."""
    own = list(declaration)
    while any(token.text == "," for token in own):
        own = own[[token.text for token in own].index(",") + 1 :]
    brackets = [i for i, token in enumerate(own) if token.text == "["]
    names = [token.text for token in own[: brackets[0] if brackets else len(own)] if token.kind == "name"]
    return names[-1] if names else ""
