"""Registers against their words: what any input, a sine and noise can bring them to."""

from collections.abc import Iterator, Sequence
from math import isfinite
from typing import Any

import numpy as np

from streamhost.report.chart import Axis, Chart, Edge, Points
from streamhost.report.contents import Contents, Lane
from streamhost.report.figure import Figure, Panel, shown_in
from streamhost.report.svg import BOTTOM, TOP, width
from streamhost.report.words import number, several

METHOD = ("Long tick: the most that any input within full scale brings a register to (the L1 norm of its response). Short "
          "tick: the most that a sine does. Dot: what white noise of full-scale power does, rms. Hatched: beyond the word. "
          "Proven where the L1 norm with all roundings fits. No signal and no seed, but for the counts.")
MOST_ROWS = 8
ROW = 24.0
TICKS = (("tick-l1", "l1"), ("tick-sine", "peak"), ("tick-noise", "l2"))


def figures(contents: Contents) -> Iterator[Figure]:
    """One figure on a common scale, a panel of rows for each realization that has words."""
    found = shown_in(contents.lanes, "overflow")
    if not any(result.registers for _, result in found):
        return
    levels = [level for _, result in found for register in result.registers for _, key in TICKS
              if isfinite(level := _over(register, key))]
    low = 12.0 * np.floor(max(min(levels, default=-24.0), -96.0) / 12.0 - 0.25)
    high = 12.0 * np.ceil(max(max(levels, default=0.0), 12.0) / 12.0 + 0.25)
    axis = Axis(low, high, "dB", least=low - 120.0, most=high + 120.0)
    rows = [_rows(result) for _, result in found]
    left = max(width(name) for names in rows for name in _names(names)) + 8.0
    panels = tuple(_panel(lane, result, own, axis, left) for (lane, result), own in zip(found, rows, strict=True))
    yield Figure(_caption(found), METHOD, panels, columns=1)


def _rows(result: Any) -> list[Any]:
    """The registers with least headroom, in the order of the diagram."""
    tightest = sorted(result.registers, key=lambda register: register.headroom_db)[:MOST_ROWS]
    return [register for register in result.registers if register in tightest]


def _names(rows: Sequence[Any]) -> tuple[str, ...]:
    return tuple(f"{register.name.removeprefix('the ')}, {register.word}" for register in rows)


def _over(register: Any, key: str) -> float:
    """How far a norm is above what the word holds, in dB."""
    value = getattr(register, key)
    return 20.0 * float(np.log10(value / register.largest)) if value > 0.0 and isfinite(value) else float(value or -np.inf)


def _caption(found: Sequence[tuple[Lane, Any]]) -> str:
    several_lanes = len(found) > 1
    proven = [str(lane.number) for lane, result in found if result.registers and result.proven]
    said = []
    for lane, result in found:
        if result.registers and not result.proven:
            name = f"{lane.number} lacks" if several_lanes else "The realization lacks"
            kept = f"{number(-result.headroom_db)} dB of headroom" if result.headroom_db < 0.0 else "a proof"
            counted = several(result.overflows, "overflow")
            said.append(f"{name} {kept} in {result.headroom_register}, with {counted} on this input")
    safe = f"Proven for {', '.join(proven)}: no input overflows a register. " if proven and several_lanes else \
        "Proven: no input overflows a register. " if proven else ""
    return f"How full registers become, in dB over their word. {safe}{'; '.join(said)}{'.' if said else ''}".strip()


def _panel(lane: Lane, result: Any, rows: Sequence[Any], axis: Axis, left: float) -> Panel:
    if not rows:
        return Panel(lane.short, str(lane.number), note=f"not asked: {result.reason}")
    down = np.arange(len(rows), dtype=np.float64)
    points = tuple(Points(shape, np.minimum([_over(register, key) for register in rows], axis.high - 1.0), down)
                   for shape, key in TICKS)
    kept = f"headroom {number(result.headroom_db)} dB"
    counted = "proven" if result.proven else several(result.overflows, "overflow")
    more = f"; {len(result.registers) - len(rows)} more in figures.json" if len(rows) < len(result.registers) else ""
    chart = Chart(f"Registers of realization {lane.number}: {kept} in {result.headroom_register}, {counted}", axis,
                  Axis(len(rows) - 0.5, -0.5, rows=_names(rows)), (Edge("x", 0.0, 1), *points), left=left)
    return Panel(f"{lane.short}: {kept}, {counted}{more}", str(lane.number), chart, high=ROW * len(rows) + TOP + BOTTOM)
