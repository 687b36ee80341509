"""What commands share: options, presets from the command line, JSON, the progress line and the ledger."""

import json
import math
import shutil
import sys
import time
import unicodedata
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from tempfile import TemporaryFile
from types import TracebackType
from typing import TYPE_CHECKING, Any, TextIO

import click

from streamhost.errors import MachineError, PresetError, RequestError

if TYPE_CHECKING:
    from streamhost.files import AudioInfo
    from streamhost.presets import Preset

MINUS = "\N{MINUS SIGN}"
RULE = "\N{BOX DRAWINGS LIGHT HORIZONTAL}"
NOT_GIVEN = "\N{EN DASH}"
GAP = "  "
PATIENCE = 2.0

force_option = click.option("--force", is_flag=True, help="Overwrite files that exist.")
json_option = click.option(
    "--json", "json_file", metavar="FILE", default=None,
    help="Write the figures as JSON, each key with its unit; - is standard output.",
)
report_option = click.option(
    "--report", metavar="DIR", help="Write a report into a new folder: a page that opens from disk, its figures, its audio.",
)
vary_option = click.option(
    "--vary", "variations", metavar="KEY=V1,V2", multiple=True,
    help="Make a family of each preset, for instance structure.form=direct-1,transposed-2; in compare and profile, "
         "structure.form=all takes all forms that carry the filter. May be repeated.",
)
vary_one_option = click.option(
    "--vary", "variations", metavar="KEY=VALUE", multiple=True,
    help="Change a key of the preset, for instance structure.form=direct-1. May be repeated.",
)


def _take_up(ctx: click.Context, param: click.Parameter, files: Sequence[str]) -> None:
    if ctx.resilient_parsing:
        return
    from streamhost.structures.own import installed, load_structures

    installed()
    for file in files:
        load_structures(file)


structures_option = click.option(
    "--structures", metavar="FILE.py", multiple=True, expose_value=False, is_eager=True, callback=_take_up,
    help="Run a Python file that declares structures of your own, and take them up as forms. May be repeated.",
)


def version() -> str:
    """The number of this version."""
    from importlib import metadata

    try:
        return metadata.version("streamhost")
    except metadata.PackageNotFoundError:
        return "run from a folder, not installed"


def presets_named(names: Sequence[str], variations: Sequence[str] = ()) -> "list[Preset]":
    """The presets of these files or shipped names, varied; PresetError with the mistakes of all files together."""
    from streamhost.presets import load_preset, vary
    from streamhost.shipped import resolve

    presets: list[Preset] = []
    problems: list[str] = []
    for name in names:
        try:
            presets.append(load_preset(resolve(name, "preset"), name=name))
        except PresetError as error:
            problems += error.problems
    if problems:
        raise PresetError(problems)
    return vary(presets, variations)


def at_rate(preset: "Preset", info: "AudioInfo", source: str) -> "Preset":
    """The preset at the rate of a file, `source` as asked for. RequestError where it is not stated for that rate."""
    if info.rate not in preset.rates:
        raise RequestError(
            f"{preset.source.name}: this preset has {preset.rates_text}, and {source} has {info.rate} Hz. Rates are not "
            "converted: give a file of that rate, or a preset for this one."
        )
    return preset.at(info.rate)


def write_json(destination: str, document: object, *, force: bool = False) -> None:
    """Figures as JSON into a file, or to standard output for "-"; a number that is not finite becomes null."""
    text = json.dumps(_finite(document), indent=2, ensure_ascii=False, allow_nan=False) + "\n"
    if destination == "-":
        click.echo(text, nl=False)
        return
    from streamhost.files import write_text_atomic

    write_text_atomic(destination, text, overwrite=force)


def check_place(path: Path) -> None:
    """RequestError or MachineError where no file can be written: before the work whose result it is to hold."""
    from streamhost.files.atomic import machine_error

    if path.is_dir():
        raise RequestError(f"{path}: this is a folder. Give the name of a file in it.")
    try:
        with TemporaryFile(dir=path.absolute().parent):
            pass
    except (FileNotFoundError, NotADirectoryError):
        raise RequestError(f"{path}: the folder {path.parent} does not exist. Make it first, or choose another.") from None
    except OSError as problem:
        raise machine_error("write", path, problem) from problem


def check_new(path: Path, input: Path | None, *, force: bool) -> None:
    """RequestError for the input itself, and for a file that exists unless `force`."""
    from streamhost.files import same_file

    if input is not None and same_file(path, input):
        raise RequestError(f"{path}: this would be written over the input. Choose another name.")
    if path.exists() and not force:
        raise RequestError(f"{path}: this file exists. Choose another name, or overwrite it with --force.")


def check_figures(name: str | None, input: Path | None, *, force: bool) -> None:
    """RequestError or MachineError where figures cannot be written into the file of that name."""
    if name is not None and name != "-":
        check_new(Path(name), input, force=force)
        check_place(Path(name))


def check_folder(folder: Path) -> None:
    """RequestError where that cannot be a folder for files."""
    if folder.exists() and not folder.is_dir():
        raise RequestError(f"{folder}: this is a file, and --output takes the name of a folder.")
    if not folder.absolute().parent.is_dir():
        raise RequestError(f"{folder}: the folder {folder.parent} does not exist. Make it first, or choose another.")


def check_report(name: str | None, *, force: bool) -> None:
    """RequestError, before any work, where no report can be written into a folder of that name."""
    if name is not None:
        from streamhost.report import check_report as check

        check(Path(name), force=force)


def tell_report(name: str | None) -> None:
    """Where the report is to be opened."""
    if name is not None:
        click.echo(f"\nReport: {printable(str(Path(name) / 'index.html'))}")


def make_folder(folder: Path) -> None:
    """The folder, made where it is not there."""
    try:
        folder.mkdir(exist_ok=True)
    except OSError as problem:
        raise MachineError(f"{folder}: cannot make this folder: {problem.strerror}. Choose another place.") from problem


def _finite(value: Any) -> Any:
    if isinstance(value, float):
        return value if math.isfinite(value) else None
    if isinstance(value, Mapping):
        return {str(key): _finite(entry) for key, entry in value.items()}
    if isinstance(value, list | tuple):
        return [_finite(entry) for entry in value]
    return value


def progress_line(command: str, number: int, total: int, label: str, seconds_left: float | None) -> str:
    """One line such as 'compare  3 of 8  direct-2 Q1.15   41 s left'."""
    left = "" if seconds_left is None else f"   {_duration(seconds_left)} left"
    return f"{command}{GAP}{number} of {total}{GAP}{printable(label)}{left}"


def _duration(seconds: float) -> str:
    whole = math.ceil(seconds)
    return f"{whole} s" if whole < 100 else f"{math.ceil(seconds / 60)} min"


class Progress:
    """Says on stderr how far the work is: one line, written again at every step on a terminal.

    `weights`: about how long each item takes against the others, all alike unless said.

    Where stderr is no terminal, every step has its own line, and none as long as the work has taken less than 2 s.
    """

    def __init__(
        self, command: str, total: int, weights: Sequence[float] | None = None, *, stream: TextIO | None = None,
        clock: Callable[[], float] = time.monotonic,
    ) -> None:
        self._command, self._total = command, total
        self._weights = [1.0] * total if weights is None else weights
        self._stream = stream or sys.stderr
        self._clock = clock
        self._terminal = self._stream.isatty()
        self._began = clock()
        self._done, self._label = 0, ""

    def __enter__(self) -> "Progress":
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        if self._terminal:
            self._stream.write("\r\x1b[K")
            self._stream.flush()

    def step(self, label: str) -> None:
        """The work on the next item begins; the one before it is done."""
        passed, done = self._clock() - self._began, sum(self._weights[: self._done])
        self._done, self._label = self._done + 1, label
        line = self._line(label, passed, done)
        if self._terminal:
            self._rewrite(line)
        elif passed > PATIENCE:
            self._stream.write(f"{line}\n")
            self._stream.flush()

    def within(self, share: float, doing: str) -> None:
        """So much of the item is done, 0 to 1, and what is being done now. Where stderr is no terminal, nothing is said."""
        if self._terminal:
            begun = sum(self._weights[: self._done - 1]) + share * self._weights[self._done - 1]
            self._rewrite(self._line(f"{self._label}{GAP}{doing}", self._clock() - self._began, begun))

    def _line(self, label: str, passed: float, done: float) -> str:
        left = passed / done * (sum(self._weights) - done) if done > 0.0 else None
        return progress_line(self._command, self._done, self._total, label, left)

    def _rewrite(self, line: str) -> None:
        width = shutil.get_terminal_size().columns - 1
        self._stream.write(f"\r{line[:width]}\x1b[K")
        self._stream.flush()


Cell = str | int | float | None


@dataclass(frozen=True)
class Column:
    """A column of a ledger: its head, the unit under it, and how many decimals its numbers show."""

    head: str
    unit: str = ""
    decimals: int | None = None


class Ledger(str):
    """A ledger's text that knows its columns and cells: heads with units, texts, and which columns hold numbers."""

    heads: tuple[tuple[str, str], ...]
    cells: tuple[tuple[str, ...], ...]
    numeric: tuple[bool, ...]


def ledger(columns: Sequence[Column], rows: Sequence[Sequence[Cell]], *, numbered: bool = True) -> Ledger:
    """A table with thin rules: numerals first, decimal points under each other, U+2212 as minus.

    None shows as a dash. A column that holds a number is set to the right, any other to the left.
    """
    if numbered:
        columns = [Column(""), *columns]
        rows = [[number, *row] for number, row in enumerate(rows, 1)]
    assert all(len(row) == len(columns) for row in rows), "every row has a cell for each column"
    heads = [[column.head for column in columns]]
    if any(column.unit for column in columns):
        heads.append([column.unit for column in columns])
    set_columns = [
        _set_column(column, [head[index] for head in heads], [row[index] for row in rows])
        for index, column in enumerate(columns)
    ]
    lines = [GAP.join(cells).rstrip() for cells in zip(*set_columns, strict=True)]
    rule = RULE * max(_width(line) for line in lines)
    made = Ledger("\n".join([*lines[: len(heads)], rule, *lines[len(heads) :], rule]))
    made.heads = tuple((column.head, column.unit) for column in columns)
    made.cells = tuple(tuple(_text(cell, column.decimals) for cell, column in zip(row, columns, strict=True)) for row in rows)
    made.numeric = tuple(any(_is_number(row[place]) for row in rows) for place in range(len(columns)))
    return made


def _is_number(cell: Cell) -> bool:
    return isinstance(cell, int | float)


def _set_column(column: Column, heads: Sequence[str], cells: Sequence[Cell]) -> list[str]:
    """Heads and cells of one column, padded to one width."""
    numeric = any(map(_is_number, cells))
    texts = [_text(cell, column.decimals) for cell in cells]
    if numeric:
        texts = _aligned(texts, [_is_number(cell) for cell in cells])
    heads = [printable(head) for head in heads]
    width = max(map(_width, [*heads, *texts]))
    padded = [" " * (width - _width(text)) for text in [*heads, *texts]]
    return [pad + text if numeric else text + pad for text, pad in zip([*heads, *texts], padded, strict=True)]


def _text(cell: Cell, decimals: int | None) -> str:
    if cell is None or (isinstance(cell, float) and math.isnan(cell)):
        return NOT_GIVEN
    if isinstance(cell, str):
        return printable(cell)
    if isinstance(cell, float) and math.isinf(cell):
        return "\N{INFINITY}" if cell > 0 else f"{MINUS}\N{INFINITY}"
    text = f"{cell:g}" if decimals is None else f"{cell:.{decimals}f}"
    if isinstance(cell, int):
        text = str(int(cell))
    return text.replace("-", MINUS) if any(digit in "123456789" for digit in text) else text.removeprefix("-")


def _aligned(texts: Sequence[str], numbers: Sequence[bool]) -> list[str]:
    """Numbers padded on the right so that their points stand under each other."""
    behind = [len(text) - text.index(".") if "." in text else 0 for text in texts]
    longest = max(length for length, number in zip(behind, numbers, strict=True) if number)
    return [
        text + " " * (longest - length) if number else text
        for text, length, number in zip(texts, behind, numbers, strict=True)
    ]


def printable(text: str) -> str:
    """The text without what would act on a terminal instead of showing."""
    return "".join(character if character.isprintable() else "\N{REPLACEMENT CHARACTER}" for character in text)


def _width(text: str) -> int:
    """How many columns of a terminal a text takes."""
    wide = sum(unicodedata.east_asian_width(character) in "WF" for character in text)
    return len(text) + wide - sum(unicodedata.combining(character) > 0 for character in text)
