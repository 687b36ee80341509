"""On which line of a preset each key stands.

The TOML reader of the standard library gives values without their places. This one walks over the same text and gives
places without values: a path such as ("filter", 0, "sections", 2) stands on a line. It knows just enough of TOML for
that, never fails on text that is no TOML, and finds two things on its way that a reader would choke on.
"""

import re
import tomllib
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field

Path = tuple[str | int, ...]

DEEPEST = 16
LONGEST_KEY = 16

_TOKEN = re.compile(
    r'(?P<text>"""(?:[^\\]|\\.)*?"""(?!")'
    r"|'''.*?'''(?!')"
    r'|(?!"""|\'\'\')(?:"(?:[^"\\\n]|\\.)*"'
    r"|'[^'\n]*'))"
    r"""|(?P<broken>["'])"""
    r"|(?P<comment>\#[^\n]*)"
    r"|(?P<newline>\n)"
    r"|(?P<mark>[\[\]{}=,])"
    r"""|(?P<bare>[^\s\[\]{},=#"']+)""",
    re.DOTALL,
)


@dataclass(frozen=True)
class Lines:
    """The line of every path that the text states, and what in it goes too deep, as (line, message)."""

    at: Mapping[Path, int]
    too_deep: tuple[int, str] | None = None

    def line(self, path: Path) -> int | None:
        """The line of `path`, else of the innermost table or list around it that is stated; None for the whole file."""
        for length in range(len(path), 0, -1):
            if path[:length] in self.at:
                return self.at[path[:length]]
        return None


def scan(text: str) -> Lines:
    """The lines of all keys, list elements and tables of a TOML text."""
    scanner = _Scanner()
    for kind, token, line in _tokens(text):
        scanner.take(kind, token, line)
        if scanner.too_deep:
            break
    return Lines(scanner.at, scanner.too_deep)


def split_at_commas(text: str) -> list[str]:
    """The parts between the commas that stand in no list, table or quotes."""
    parts, start, depth = [], 0, 0
    for match in _TOKEN.finditer(text):
        if match[0] in ("[", "{"):
            depth += 1
        elif match[0] in ("]", "}"):
            depth -= 1
        elif match[0] == "," and depth == 0:
            parts.append(text[start : match.start()])
            start = match.end()
    return [*parts, text[start:]]


def _tokens(text: str) -> Iterator[tuple[str, str, int]]:
    line = 1
    for match in _TOKEN.finditer(text):
        kind, token = str(match.lastgroup), match[0]
        if kind == "broken":
            return
        if kind != "comment":
            yield kind, token, line
        line += token.count("\n")


@dataclass
class _Open:
    """A list or an inline table that is not closed yet; `index` counts the elements of a list."""

    path: Path
    index: int | None

    @property
    def element(self) -> Path:
        return self.path if self.index is None else (*self.path, self.index)


@dataclass
class _Scanner:
    """Takes one token after the other; `key` holds the parts of the key being read, None while a value is awaited."""

    at: dict[Path, int] = field(default_factory=dict)
    too_deep: tuple[int, str] | None = None
    table: Path = ()
    tables: dict[Path, int] = field(default_factory=dict)
    open: list[_Open] = field(default_factory=list)
    key: list[str] | None = field(default_factory=list)
    value: Path = ()
    header: int = 0

    def take(self, kind: str, token: str, line: int) -> None:
        if kind == "newline":
            self._end_line()
        elif kind == "mark":
            self._mark(token, line)
        elif self.key is None:
            self._mention(self.value, line)
        else:
            self.key += [_unquoted(token)] if kind == "text" else [part for part in token.split(".") if part]
            if len(self.key) > LONGEST_KEY:
                self.too_deep = line, f"a key of more than {LONGEST_KEY} parts."

    def _end_line(self) -> None:
        if not self.open:
            self.key, self.header = [], 0

    def _mark(self, token: str, line: int) -> None:
        if token == "[" and self.key is not None:
            self.header += 1
        elif token == "]" and self.header:
            self._close_header(line)
        elif token == "=" and self.key is not None:
            base = self.open[-1].element if self.open else self.table
            self.value = (*base, *self.key)
            for length in range(len(base) + 1, len(self.value) + 1):
                self._mention(self.value[:length], line)
            self.key = None
        elif token in "[{":
            self._open_value(token, line)
        elif token in "]}" and self.open:
            self.open.pop()
            self.key = None
        elif token == "," and self.open:
            self._next_element()

    def _open_value(self, token: str, line: int) -> None:
        self._mention(self.value, line)
        is_list = token == "["
        self.open.append(_Open(self.value, 0 if is_list else None))
        self.key = None if is_list else []
        self.value = self.open[-1].element
        if len(self.open) > DEEPEST:
            self.too_deep = line, f"lists or tables inside each other more than {DEEPEST} deep."

    def _next_element(self) -> None:
        around = self.open[-1]
        if around.index is None:
            self.key = []
        else:
            around.index += 1
            self.value, self.key = around.element, None

    def _close_header(self, line: int) -> None:
        if not self.key:
            self.header = 0
            return
        path: Path = ()
        for part in self.key[:-1]:
            path = (*path, part)
            self._mention(path, line)
            if path in self.tables:
                path = (*path, self.tables[path])
        path = (*path, self.key[-1])
        self._mention(path, line)
        if self.header > 1:
            self.tables[path] = self.tables.get(path, -1) + 1
            path = (*path, self.tables[path])
        self._mention(path, line)
        self.table, self.key, self.header = path, [], 0

    def _mention(self, path: Path, line: int) -> None:
        self.at.setdefault(path, line)


def _unquoted(token: str) -> str:
    try:
        return str(tomllib.loads(f"key = {token}")["key"])
    except ValueError:
        return token
