"""What the instrument `limit_cycles` says."""

from collections.abc import Iterator

from streamhost.commands.common import MINUS, Cell, Column, ledger
from streamhost.commands.measuring.wave import Wave
from streamhost.measure.cycles import Cycle, LimitCycles, SectionCycles, Stall

SECTIONS = (
    Column("section"), Column("register"), Column("word"), Column("states"), Column("bound", "LSB", 0),
    Column("largest", "LSB"), Column("", "dBFS", 1), Column("period", "frames"), Column("cycles"), Column("formula", "LSB"),
)
SIGNALS = (Column("after"), Column("left", "LSB"), Column("", "dBFS", 1), Column("period", "frames"))


def lines(result: LimitCycles) -> Iterator[str]:
    """A ledger of sections alone, what signals leave behind, and what constants come to."""
    if result.sections:
        yield ledger(SECTIONS, [_section(section) for section in result.sections], numbered=False)
        yield from _sections(result)
    yield from _outputs(result)
    if result.after_signals:
        yield ledger(SIGNALS, [[ended.signal, *_left(ended.cycle, ended.reason)] for ended in result.after_signals],
                     numbered=False)
    yield from _stalls(result)
    if not result.complete:
        yield "Broken off: what is not told was not looked for."


def waves(result: LimitCycles) -> Iterator[Wave]:
    """The worst cycle as the output has it, a period or more."""
    if result.worst is not None and len(result.worst.wave):
        yield Wave("worst", result.worst.wave[:, None])


def _section(section: SectionCycles) -> list[Cell]:
    worst = section.worst_granular
    period = None if worst is None else worst.period_frames
    name = section.name if section.channel is None else f"{section.name}, channel {section.channel}"
    told = "proven" if section.proven else "searched"
    return [name, section.register.removeprefix("the register "), section.word, told, section.proven_bound_lsb,
            section.found_lsb, section.found_dbfs, period, section.cycles, section.estimated_dead_band_lsb]


def _sections(result: LimitCycles) -> Iterator[str]:
    proven = [section for section in result.sections if section.proven]
    if proven:
        states = sum(section.box_states or 0 for section in proven)
        yield (f"Proven: all {states} states within the bounds were walked, and no larger cycle without overflow is possible "
               f"in {'this section' if len(proven) == 1 else 'these sections'} without input.")
    for section in result.sections:
        if not section.proven:
            left = f", {section.unresolved_states} of them did not come back in time" if section.unresolved_states else ""
            yield f"Searched: {section.name} from {section.searched_states} seeded states{left}. {_capital(section.reason)}."
        if section.worst_overflow is not None:
            lsb, period = section.worst_overflow.section_lsb, section.worst_overflow.period_frames
            yield f"Overflow oscillation in {section.name}: {lsb} LSB, {_frames(period)}."
    if any(section.estimated_dead_band_lsb is not None for section in result.sections):
        yield "The dead-band formula is an estimate for one rounding to the nearest, and no guarantee."


def _outputs(result: LimitCycles) -> Iterator[str]:
    """What is proven at the outputs, and why not more."""
    if result.proven_lsb is not None:
        yield f"At the output, proven: {result.proven_lsb} LSB at most."
    elif result.proven_bound_lsb is not None:
        yield (f"At the output: proven below {_lsb(result.proven_bound_lsb)} LSB without overflow; the largest that was found "
               f"is {result.found_lsb} LSB.")
    if result.reason:
        yield _capital(result.reason) + "."


def _left(cycle: Cycle | None, reason: str) -> list[Cell]:
    if reason:
        return [reason, None, None]
    return ["silence", None, None] if cycle is None else [cycle.output_lsb, cycle.output_dbfs, cycle.period_frames]


def _stalls(result: LimitCycles) -> Iterator[str]:
    held = [stall for stall in result.stalls if not stall.overflows]
    if not held:
        return
    worst = max(held, key=_off)
    what = "stands" if worst.period_frames == 1 else f"swings by {worst.swing_lsb:g} LSB around a value"
    at = f"{worst.input_dbfs:.1f}".replace("-", MINUS)
    yield (f"Constant input: at {at} dBFS, {worst.since}, the output {what} {_lsb(worst.off_lsb)} LSB from its final value, "
           f"the farthest of {len(held)} tries.")


def _lsb(value: float) -> str:
    return f"{value:.0f}" if value >= 100 else f"{value:.3g}"


def _off(stall: Stall) -> float:
    return stall.off_lsb


def _frames(count: int) -> str:
    return "the same in every frame" if count == 1 else f"period {count} frames"


def _capital(text: str) -> str:
    return text[:1].upper() + text[1:]
