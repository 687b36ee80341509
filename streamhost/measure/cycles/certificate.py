"""What was proven of a realization, as plain data that `recheck.py`, which knows nothing of this program, checks again."""

from collections import Counter
from pathlib import Path

import numpy as np

from streamhost.diagram.nodes import Node, Round
from streamhost.measure.cycles.boxes import no_box
from streamhost.measure.cycles.operations import Operations
from streamhost.measure.cycles.results import LimitCycles, Listed, SectionCycles

MOST_MET = 64
"""Cycles that a search met which are listed, the largest."""


def certificate(result: LimitCycles) -> dict[str, object]:
    """Everything as lists, numbers and words: for a JSON file.

    Of each section the arithmetic of one frame, in whole numbers (`nodes`, see `operations.py`); the states' coordinates and
    the bounds of those; `cycles`, how many of each kind lie in the box: [count, period, largest magnitude of each register];
    and beside it cycles that were met, [state, [period, largest magnitudes]].
    """
    return {
        "what": "limit cycles of each section alone, without input, in which nothing overflows",
        **dict(result.described),
        "output_bound_lsb": result.proven_bound_lsb,
        "output_proven_lsb": result.proven_lsb,
        "output_found_lsb": result.found_lsb,
        "seed": result.seed,
        "complete": result.complete,
        "sections": [_section(section) for section in result.sections],
    }


def script() -> str:
    """The text of the script that checks a certificate again."""
    return Path(__file__).with_name("recheck.py").read_text(encoding="utf-8")


def _section(section: SectionCycles) -> dict[str, object]:
    program, channel = section.program, (section.channel or 1) - 1
    box = section.box or no_box(len(section.states))
    made, stored = Operations(program, channel), program.stored
    assert stored is not None, "a fixed-point program"
    slots = [{"label": slot.label, "word": str(word)} for slot, word in zip(program.diagram.slots, stored.words, strict=True)]
    registers = section.known.nodes
    return {
        "name": section.name if section.channel is None else f"{section.name} of channel {section.channel}",
        "coefficients": slots,
        "codes": [row[min(channel, len(row) - 1)] for row in stored.codes],
        "nodes": made.lines,
        "next": made.following,
        "registers": [made.place[index] for index in registers],
        "words": [{"register": program.nodes[index].label, "quantizer": _quantizer(program.nodes[index])}
                  for index in registers],
        "transform": box.transform.tolist(),
        "inverse": box.inverse.tolist(),
        "bounds": list(box.bounds) if box.plain else [],
        "box_states": section.box_states,
        "proven": section.proven,
        "proven_bound_lsb": section.proven_bound_lsb,
        "proven_lsb": section.proven_lsb,
        "cycles": _kinds(section),
        "met": _met(section),
        "searched_states": section.searched_states,
        "reason": section.reason,
    }


def _quantizer(node: Node) -> str:
    return str(node.quantizer) if isinstance(node, Round) else ""


def _kinds(section: SectionCycles) -> list[list[int]]:
    """[count, period, largest magnitude of each register], sorted by the latter; rest is one of them."""
    if not section.proven:
        return []
    rest = (1, *(0 for _ in section.known.nodes))
    found = Counter([rest, *(tuple(map(int, column)) for column in np.vstack((section.known.periods, section.known.high)).T)])
    return [[count, *kind] for kind, count in sorted(found.items())]


def _met(section: SectionCycles) -> list[list[list[int]]]:
    met: Listed = section.met
    largest = np.argsort(met.high.max(axis=0, initial=0), kind="stable")[::-1][:MOST_MET]
    return [[met.states[:, lane].tolist(), [int(met.periods[lane]), *met.high[:, lane].tolist()]] for lane in largest]
