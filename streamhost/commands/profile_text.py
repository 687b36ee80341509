"""What a profile says: ledgers of time, of operations, of bounds and of a core; the same figures for a program."""

from collections.abc import Iterator, Sequence
from itertools import pairwise

from streamhost.commands.common import Cell, Column, ledger, printable
from streamhost.commands.compare import label
from streamhost.commands.compare_text import refused, refused_document, short_title
from streamhost.commands.documents import document_of
from streamhost.commands.profile import Costed
from streamhost.profile import Profiled, Timing
from streamhost.profile.timing import LEAST

SHOWN_BLOCKS = (64, 256, 1024)
KINDS = ("multiply", "add", "shift", "round", "saturate", "load", "store", "frame")
LONGEST_PATH = 8
WHOLE = 100.0

LANES = (
    Column("lane"), Column("form · decomposition · format"), Column("state", "words"), Column("", "bytes"),
    Column("coefficients", "words"), Column("", "bytes"),
)
TIME = (
    Column(""), Column("channels"), Column("block", "frames"), Column("time", "ns/frame", 2), Column("spread", "± %", 1),
    Column("deadline", "%", 3), Column("lanes", "a core", 0), Column("99.9 %", "µs", 1), Column("worst", "µs", 1),
    Column("cost", "×", 2),
)
WORK = (
    Column("multiply"), Column("add"), Column("shift"), Column("round"), Column("saturate"), Column("load"), Column("store"),
)
BOUNDS = (
    Column("loop", "cycles", 1), Column("in to out", "cycles", 0), Column("operations", "cycles", 1), Column("rules"),
    Column("bound", "ns/frame", 2), Column("took", "cycles", 1), Column("slowest loop"),
)


def text(costed: Costed) -> str:
    """The whole for a terminal."""
    found = costed.profile.realizations
    paragraphs = [
        ledger(LANES, list(_lane_rows(costed))),
        ledger(TIME, list(_time_rows(found)), numbered=False),
        ledger(WORK, [_work_row(one) for one in found]),
        ledger(BOUNDS, [_bounds_row(one) for one in found]),
        "\n".join(_core(costed)),
        " ".join(refused(costed.refusals, "profiled")),
        "\n".join(_method(costed)),
    ]
    return "\n\n".join(paragraph for paragraph in paragraphs if paragraph)


def _lane_rows(costed: Costed) -> Iterator[list[Cell]]:
    for preset, realization, found in zip(costed.presets, costed.realizations, costed.profile.realizations, strict=True):
        work = found.work
        yield [short_title(preset), label(realization), work.state_words, work.state_bytes, work.coefficient_words,
               work.coefficient_bytes]


def _time_rows(found: Sequence[Profiled]) -> Iterator[list[Cell]]:
    """The blocks that are shown, and the tail: of each realization, numbered once, and of each number of channels."""
    for number, one in enumerate(found, 1):
        rows = [row for timing in one.timings for row in _timing_rows(timing)]
        for place, row in enumerate(rows):
            yield [str(number) if place == 0 else "", *row]


def _timing_rows(timing: Timing) -> Iterator[list[Cell]]:
    channels = str(timing.channels)
    for block in timing.blocks:
        if block.block_frames in SHOWN_BLOCKS:
            yield [channels, str(block.block_frames), block.ns_per_frame, block.spread_percent, block.deadline_percent,
                   block.lanes_per_core, block.p999_block_us, block.worst_block_us, block.times_cheapest]
    if timing.tail is not None:
        tail = timing.tail
        yield [channels, f"{tail.block_frames}, tail", tail.ns_per_frame, tail.spread_percent, *[""] * 5]


def _work_row(one: Profiled) -> list[Cell]:
    work = one.work
    return [work.multiplications, work.additions, work.shifts, work.roundings, work.saturations, work.loads, work.stores]


def _bounds_row(one: Profiled) -> list[Cell]:
    bounds = one.bounds
    loop = bounds.loop_cycles if bounds.loop_path else None
    return [loop, bounds.way_cycles, bounds.busy_cycles, bounds.rules, bounds.bound_ns, bounds.measured_cycles,
            _path(bounds.loop_path)]


def _path(labels: Sequence[str]) -> str:
    """A loop as it goes round; what only rounds has its register's name and is left out."""
    named = [each for each in labels if ".q" not in each]
    named = [first for first, second in pairwise([*named, ""]) if first != second]
    shown = named if len(named) <= LONGEST_PATH else [*named[: LONGEST_PATH - 1], "…"]
    return " → ".join(shown)


def _core(costed: Costed) -> Iterator[str]:
    """The ledger of the user's core, and what it does not tell."""
    core = costed.core
    if core is None:
        return
    columns = (*(Column(kind, "cycles", 0) for kind in KINDS), Column("in all", "cycles", 0), Column("budget", "%", 2))
    rows: list[list[Cell]] = []
    remarks = []
    for number, one in enumerate(costed.profile.realizations, 1):
        estimate = one.estimate
        assert estimate is not None, "a core was given"
        known = estimate.cycles_per_frame is not None
        rows.append([*(estimate.by_kind.get(kind, 0.0) if known else None for kind in KINDS), estimate.cycles_per_frame,
                     estimate.budget_percent])
        if estimate.reason:
            remarks.append(f"{number} has no estimate: {estimate.reason}.")
        elif estimate.budget_percent is not None and estimate.budget_percent > WHOLE:
            remarks.append(f"{number} does not fit: {estimate.budget_percent:.0f} % of what there is, for one channel.")
    yield printable(f"{core.title}, {core.clock_mhz:g} MHz, words of {core.word_bits} bits, accumulator of "
                    f"{core.accumulator_bits}: cycles of a frame and channel, and their share of those between two frames.")
    yield ledger(columns, rows)
    yield from remarks


def _method(costed: Costed) -> Iterator[str]:
    method = costed.profile.method
    pinned = f"pinned to processor {method.pinned_to}" if method.pinned_to is not None else "not pinned to a processor"
    widths = sorted({(timing.channels, timing.width) for one in costed.profile.realizations for timing in one.timings})
    doubtful = f": in {method.doubtful_percent:.0f} % of the figures, which are worth little" if method.doubtful_percent else ""
    at_once = ", ".join(f"{width} of {channels}" for channels, width in widths)
    yield (f"Timed: plain kernels on noise, called as the host calls them, channels at once: {at_once}; {pinned}; warmed up; "
           f"{method.rounds} interleaved rounds of {method.blocks_a_round} blocks.")
    yield (f"Time: the median of rounds, corrected by a calibration loop before and after each: {method.clock_ghz:.2f} GHz, "
           f"95 % of its readings within {method.drift_percent:.1f} %. In {method.shared_percent:.0f} % of the samples another "
           f"loop found the core shared with other work; they count only where fewer than {LEAST} others are left{doubtful}. "
           "Spread: half of what the middle half of the rounds spans.")
    yield ("Deadline: the share of a block's time at the preset's rate. 99.9 % and worst: of all blocks as they came, with "
           "what else this machine did. Cost: against the cheapest at that length of block.")
    if tails := list(_tails(costed.profile.realizations)):
        yield ("Tail: silence from states scaled into the subnormal numbers, set anew for each block. Against noise it takes "
               f"{', '.join(tails)} times as long.")
    yield ("Bounds: of one channel on a common 64-bit core by a stated table of latencies. Loop: cycles per frame around the "
           "slowest loop, however wide the core; operations: to begin them all, one by one. Took: at the calibrated clock.")
    if method.no_counters:
        yield f"Retired instructions and cycles: not given, since {method.no_counters}."
    else:
        yield "Retired instructions and cycles a frame: " + "; ".join(_retired(costed)) + "."


def _tails(found: Sequence[Profiled]) -> Iterator[str]:
    for number, one in enumerate(found, 1):
        factors = [f"{timing.tail.times_normal:.2f}" for timing in one.timings if timing.tail is not None]
        if factors:
            yield f"{number}: {' and '.join(factors)}"


def _retired(costed: Costed) -> Iterator[str]:
    for number, one in enumerate(costed.profile.realizations, 1):
        for timing in one.timings:
            if timing.instructions_per_frame is not None and timing.cycles_per_frame is not None:
                several = f" on {timing.channels} channels" if len(one.timings) > 1 else ""
                yield f"{number}{several} {timing.instructions_per_frame:.1f} and {timing.cycles_per_frame:.1f}"


def document(costed: Costed) -> dict[str, object]:
    """The figures under keys that are spelt with their unit; those not given are None."""
    core = costed.core
    return {
        "method": document_of(costed.profile.method),
        "core": None if core is None else {"title": core.title, "clock_mhz": core.clock_mhz, "word_bits": core.word_bits,
                                           "accumulator_bits": core.accumulator_bits},
        "refused": refused_document(costed.refusals),
        "realizations": [
            {"preset": preset.source.name, "title": preset.title, "decomposition": realization.decomposition,
             "form": realization.form, "format": realization.format.label, "rate": realization.rate, **document_of(found)}
            for preset, realization, found in zip(costed.presets, costed.realizations, costed.profile.realizations, strict=True)
        ],
    }
