"""Every mistake of a preset or of another file of tables, gathered: file, line, key, value, rule, what is allowed."""

import json
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field

from streamhost.errors import PresetError, nearest
from streamhost.presets.lines import Lines, Path

MOST_SHOWN = 60


@dataclass
class Mistakes:
    """Collects problems of one file; `name` is how the user knows it, `what` what it is."""

    name: str
    lines: Lines
    what: str = "a preset"
    found: list[tuple[int, str]] = field(default_factory=list)

    def add(self, path: Path, message: str) -> None:
        """A problem at `path`; the message begins with the name of the key, or says what the file lacks."""
        self.found.append((self.lines.line(path) or 0, message))

    def value(self, path: Path, value: object, message: str) -> None:
        """A problem with the value at `path`: 'key = value' and then the message."""
        self.add(path, f"{key_text(path)} = {value_text(value)} {message}")

    def unknown(self, path: Path, allowed: Iterable[str]) -> None:
        """A key that is not known where it stands."""
        names = tuple(allowed)
        key = str(path[-1])
        place = place_text(path[:-1], self.what)
        self.add(path, f"{one_line(key)} is no key of {place}, which takes {listed(names)}.{nearest(key, names)}")

    def texts(self) -> list[str]:
        """One line for each problem, in the order of the file."""
        ordered = sorted(dict.fromkeys(self.found), key=lambda problem: problem[0])
        return [f"{self.name}:{line}: {message}" if line else f"{self.name}: {message}" for line, message in ordered]

    def raise_any(self) -> None:
        """Raises PresetError if there was a mistake."""
        if self.found:
            raise PresetError(self.texts())


def listed(names: Iterable[str]) -> str:
    """'a, b or c'; of no names 'nothing'."""
    names = tuple(names)
    if len(names) < 2:
        return names[0] if names else "nothing"
    return f"{', '.join(names[:-1])} or {names[-1]}"


def place_text(path: Path, what: str) -> str:
    """How a table is named to the user: the head of the file, [format], [[filter]] number 2."""
    if not path:
        return f"the head of {what}"
    if path[0] == "filter":
        return "this [[filter]]" if len(path) == 2 else f"{key_text(path)} in this [[filter]]"
    return f"[{path[0]}]" if len(path) == 1 else f"{key_text(path)} in [{path[0]}]"


def key_text(path: Path) -> str:
    """The key without its table: 'sections[1][2]', counted from 0 as the messages of a filter count."""
    tables = 2 if path[0] == "filter" else 1
    inside = path[tables:] or path
    text = str(inside[0])
    for part in inside[1:]:
        text += f"[{part}]" if isinstance(part, int) else f".{part}"
    return one_line(text)


def value_text(value: object) -> str:
    """A value as a preset writes it, shortened."""
    return _shortened(_toml(value, 0))


def _toml(value: object, depth: int) -> str:
    if depth > 2:
        return "..."
    if isinstance(value, str):
        return one_line(json.dumps(value[: 2 * MOST_SHOWN], ensure_ascii=False))
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, int):
        return str(value) if value.bit_length() < 200 else f"a whole number of {value.bit_length()} bits"
    if isinstance(value, Mapping):
        entries = [f"{one_line(key)} = {_toml(entry, depth + 1)}" for key, entry in value.items()]
        return f"{{ {', '.join(entries)} }}" if entries else "{}"
    if isinstance(value, list | tuple):
        return f"[{', '.join(_toml(entry, depth + 1) for entry in value[:MOST_SHOWN])}]"
    return str(value)


def _shortened(text: str) -> str:
    return text if len(text) <= MOST_SHOWN else f"{text[: MOST_SHOWN - 4]} ..."


def one_line(text: str) -> str:
    """Unprintable characters written as escapes, so that a file cannot write to the terminal."""
    return _shortened("".join(c if c.isprintable() else c.encode("unicode_escape").decode("ascii") for c in text))
