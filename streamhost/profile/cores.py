"""What a realization would cost on a core of the user's own: cycles per operation from a file, and the counts.

An estimate: what a straightforward loop takes, nothing done side by side, nothing kept in registers that the counts load.
Words longer than the core's are taken apart: a multiplication into the products of its pieces and the additions that join
them, a load or store into words, what happens in an accumulator into as many accumulators.
"""

from dataclasses import dataclass
from pathlib import Path
from typing import Annotated, Any

import msgspec

from streamhost.errors import MachineError, PresetError
from streamhost.presets.lines import scan
from streamhost.presets.mistakes import Mistakes
from streamhost.presets.reading import toml_table
from streamhost.presets.tables import Number, Table, Text, Whole, read_table
from streamhost.profile.operations import Operation, operations
from streamhost.program.program import Program

LARGEST_BYTES = 100_000
MOST_BITS = 128

Cycles = Annotated[float, msgspec.Meta(ge=0, description="a number of cycles, at least 0")]


class CoreTable(msgspec.Struct, kw_only=True):
    """The head of a cost file."""

    clock_mhz: Number
    word_bits: Whole
    accumulator_bits: Whole
    cycles: Table
    title: Text | None = None


class CyclesTable(msgspec.Struct, kw_only=True):
    """[cycles]: what each operation takes."""

    multiply: Cycles
    accumulate: Cycles
    add_64: Cycles
    load: Cycles
    store: Cycles
    shift: Cycles
    round: Cycles
    saturate: Cycles
    frame: Cycles = 0.0
    float32_multiply: Cycles | None = None
    float32_add: Cycles | None = None
    float64_multiply: Cycles | None = None
    float64_add: Cycles | None = None


@dataclass(frozen=True)
class Core:
    """A core as its file states it: clock in MHz, bits of a word and of the accumulator, cycles per operation."""

    title: str
    clock_mhz: float
    word_bits: int
    accumulator_bits: int
    cycles: CyclesTable


@dataclass(frozen=True)
class Estimate:
    """Cycles of one frame of one channel in all and by kind of operation, and their share of what the clock has between two
    frames. None where the core states nothing of this arithmetic, and then why."""

    cycles_per_frame: float | None
    budget_percent: float | None
    by_kind: dict[str, float]
    reason: str | None = None


def load_core(path: Path, name: str) -> Core:
    """The core in a file; `name` is what messages call it.

    Raises PresetError with every mistake of the file, MachineError where it cannot be read.
    """
    try:
        with path.open("rb") as file:
            content = file.read(LARGEST_BYTES + 1)
    except IsADirectoryError:
        raise PresetError([f"{name}: this is a folder, and the costs of a core are a file."]) from None
    except OSError as error:
        raise MachineError(f"{name}: the file cannot be read: {error.strerror}.") from error
    try:
        text = content.decode("utf-8-sig")
    except UnicodeDecodeError:
        raise PresetError([f"{name}: the file is no text in UTF-8."]) from None
    if len(content) > LARGEST_BYTES:
        raise PresetError([f"{name}: the file is larger than 100 kB, which no core is."])
    return parse_core(text, name)


def parse_core(text: str, name: str) -> Core:
    """The core that a text states; raises PresetError with all its mistakes."""
    lines = scan(text)
    if lines.too_deep:
        raise PresetError([f"{name}:{lines.too_deep[0]}: a core has no place for {lines.too_deep[1]}"])
    mistakes = Mistakes(name, lines, what="a core")
    head = read_table(mistakes, toml_table(text, name), (), CoreTable)
    cycles = read_table(mistakes, head.get("cycles", {}), ("cycles",), CyclesTable) if "cycles" in head else {}
    _check_ranges(mistakes, head)
    mistakes.raise_any()
    title = head.get("title", Path(name).stem)
    return Core(title, head["clock_mhz"], head["word_bits"], head["accumulator_bits"], CyclesTable(**cycles))


def _check_ranges(mistakes: Mistakes, head: dict[str, Any]) -> None:
    clock = head.get("clock_mhz")
    if clock is not None and clock <= 0:
        mistakes.value(("clock_mhz",), clock, "is not allowed: a clock is a number of megahertz above 0.")
    for key in ("word_bits", "accumulator_bits"):
        bits = head.get(key)
        if bits is not None and not 8 <= bits <= MOST_BITS:
            mistakes.value((key,), bits, f"is not allowed: a core's words have from 8 to {MOST_BITS} bits.")
    if (title := head.get("title")) is not None and (not title.strip() or not title.isprintable()):
        mistakes.value(("title",), title, "is not allowed: a title is one line of printable text.")


def estimate(program: Program, core: Core, rate: float) -> Estimate:
    """What one frame of one channel takes on the core; rate in hertz."""
    if program.types and (missing := _missing(program, core.cycles)):
        return Estimate(None, None, {}, f"the core states no {missing}")
    by_kind: dict[str, float] = {"frame": core.cycles.frame}
    for each in operations(program):
        price = _float_cycles(each, core) if program.types else _fixed_cycles(each, core)
        by_kind[each.kind] = by_kind.get(each.kind, 0.0) + price
    total = sum(by_kind.values())
    return Estimate(total, 100.0 * total * rate / (core.clock_mhz * 1e6), by_kind)


def _missing(program: Program, cycles: CyclesTable) -> str:
    keys = [f"{kind}_{operation}" for kind in sorted(set(program.types)) for operation in ("multiply", "add")]
    return " and no ".join(key for key in keys if getattr(cycles, key) is None)


def _pieces(bits: int, word: int) -> int:
    return -(-bits // word)


def _memory_cycles(each: Operation, core: Core) -> float:
    words = _pieces(each.bits, core.word_bits)
    return each.count * words * (core.cycles.load if each.kind == "load" else core.cycles.store)


def _fixed_cycles(each: Operation, core: Core) -> float:
    cycles, count = core.cycles, each.count
    if each.kind in ("load", "store"):
        return _memory_cycles(each, core)
    if each.kind == "multiply":
        products = _pieces(each.bits, core.word_bits) * _pieces(each.other, core.word_bits)
        return count * (products * cycles.multiply + (products - 1) * cycles.accumulate)
    if each.kind == "add":
        longer = each.bits > core.accumulator_bits
        return count * (_pieces(each.bits, 64) * cycles.add_64 if longer else cycles.accumulate)
    return count * _pieces(each.bits, core.accumulator_bits) * float(getattr(cycles, each.kind))


def _float_cycles(each: Operation, core: Core) -> float:
    """A shift is a multiplication, a conversion costs as much as an addition."""
    if each.kind in ("load", "store"):
        return _memory_cycles(each, core)
    operation = "multiply" if each.kind in ("multiply", "shift") else "add"
    return each.count * float(getattr(core.cycles, f"float{each.bits}_{operation}"))
