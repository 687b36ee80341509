"""From what was examined to what is said: cycles of sections as the outputs hear them, and what is proven of those."""

from dataclasses import replace

import numpy as np

from streamhost.diagram.graph import reachable
from streamhost.diagram.nodes import Delay, Round
from streamhost.measure.cycles.estimates import dead_band_of
from streamhost.measure.cycles.results import Cycle, Listed, SectionCycles
from streamhost.measure.cycles.search import Landed
from streamhost.measure.cycles.sections import Examined, chosen
from streamhost.measure.cycles.whole import Whole
from streamhost.measure.levels import peak_dbfs
from streamhost.measure.naming import rounding_name
from streamhost.program.program import Program

MOST_LANDED = 1 << 18
STEPS = 1 << 28


def section_cycles(whole: Whole | None, program: Program, found: Examined, channel: int) -> SectionCycles:
    """A section's figures, with its worst cycles as the outputs hear them where that can be told."""
    both, row = together(found.known, found.met), found.known.nodes.index(found.register)
    worst = {kind: _worst(whole, program, found, both, row, overflows) for kind, overflows in (("g", False), ("o", True))}
    granular = found.known.high[row, ~found.known.overflows]
    largest = int(both.high[row, ~both.overflows].max(initial=0))
    band = dead_band_of(found.part.program, channel)
    part = found.part.program
    delays = [node.label for node in part.nodes if isinstance(node, Delay)]
    return SectionCycles(
        name=found.name,
        channel=channel + 1 if program.diagram.channels > 1 else None,
        register=_register_name(program, found),
        word=_word(part, found.register),
        states=tuple(delays),
        proven=found.walked,
        proven_all=found.walked and found.box is not None and found.box.holds_all,
        reason=found.reason,
        proven_bound_lsb=found.bound,
        proven_lsb=int(granular.max(initial=0)) if found.walked else None,
        box_states=None if found.box is None else found.box.states,
        cycles=len(found.known.periods) if found.walked else None,
        searched_states=found.searched,
        unresolved_states=found.unresolved,
        found_lsb=largest,
        found_dbfs=peak_dbfs(largest * 2.0 ** -part.numbers[found.register].fraction),
        estimated_dead_band_lsb=band.lsb,
        estimated_period_frames=band.period_frames,
        worst_granular=worst["g"],
        worst_overflow=worst["o"],
        complete=found.complete,
        program=part,
        box=found.box,
        known=found.known,
        met=found.met,
    )


def _register_name(program: Program, found: Examined) -> str:
    origin = found.part.origins[found.register]
    return rounding_name(program, origin) if isinstance(program.nodes[origin], Round) else program.nodes[origin].label


def _word(part: Program, register: int) -> str:
    node = part.nodes[register]
    return str(node.quantizer.word) if isinstance(node, Round) and node.quantizer is not None else ""


def together(first: Listed, second: Listed) -> Listed:
    return Listed(
        np.hstack((first.states, second.states)), np.concatenate((first.periods, second.periods)), first.nodes,
        np.hstack((first.high, second.high)), np.concatenate((first.overflows, second.overflows)),
    )


def _worst(whole: Whole | None, program: Program, found: Examined, both: Listed, row: int, overflows: bool) -> Cycle | None:
    """The largest in the section's register of those that overflow, or of those that do not."""
    kind = np.flatnonzero(both.overflows == overflows)
    if not len(kind):
        return None
    lane = int(kind[both.high[row, kind].argmax()])
    one, lsb = chosen(both, np.array([lane])), int(both.high[row, lane])
    period = int(one.periods[0])
    bare = Cycle(
        f"{found.name} alone", period, "dc" if period == 1 else "oscillation", overflows, _register_name(program, found), lsb,
        peak_dbfs(lsb * 2.0 ** -found.part.program.numbers[found.register].fraction), "", None, None,
        tuple(map(int, one.states[:, 0])),
    )
    if whole is None:
        return bare
    heard = whole.cycle("", landed_of(whole, found, one), 0)
    if heard is None:
        return bare
    return replace(bare, output=heard.output, output_lsb=heard.output_lsb, output_dbfs=heard.output_dbfs, wave=heard.wave)


def landed_of(whole: Whole, found: Examined, cycles: Listed) -> Landed:
    """Cycles of a section in the whole, where all else begins from 0."""
    return whole.land(whole.embedded(found.part, cycles.states), None, STEPS, lambda share: None)


def proven_at_outputs(whole: Whole | None, program: Program, found: list[Examined], loops: list[tuple[int, ...]]
                      ) -> tuple[int | None, str]:
    """The largest granular cycle that there is at an output, in steps; or None and why that is not known.

    Where no section has a cycle, each in turn comes to 0 for good, and so does the next. Where one has, and drives no
    other, the outputs hear its cycles and nothing else, once all others have come to 0.
    """
    if whole is None:
        return None, "long lines follow the sections: what the outputs hear of their cycles was not computed"
    if not all(each.walked for each in found):
        unproven = [each.name for each in found if not each.walked]
        return None, f"not proven of {', '.join(unproven)}"
    moving = [k for k, each in enumerate(found) if len(each.known.periods)]
    if not moving:
        return 0, ""
    driven = set(reachable(program.diagram.readers, loops[moving[0]]))
    if len(moving) > 1 or any(driven & set(loop) for k, loop in enumerate(loops) if k != moving[0]):
        return None, "sections with cycles drive others, or add up with them: what then comes of it was searched, not proven"
    one = found[moving[0]]
    granular = chosen(one.known, ~one.known.overflows)
    if len(granular.periods) > MOST_LANDED:
        return None, f"the {len(granular.periods)} cycles of {one.name} were not all followed to the outputs"
    landed = landed_of(whole, one, granular)
    if not (landed.found.period > 0).all():
        return None, f"not all cycles of {one.name} were followed to the outputs"
    return int(whole.peaks(landed).max(initial=0)), ""
