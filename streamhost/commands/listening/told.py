"""What a run of `listen` has to say when it has ended: JSON, a ledger, a few sentences."""

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

from streamhost.commands.common import Cell, Column, ledger
from streamhost.commands.listening.asked import Asked, Prepared

if TYPE_CHECKING:
    from streamhost.files import AudioWriter
    from streamhost.host import Changed
    from streamhost.host.shared import Shared


@dataclass(frozen=True)
class Run:
    """A run that has ended; `hashes` of the lanes' states, empty where the engine was lost. `card`: what is told of it.

    slots: of the lanes, where these are not in their order.
    """

    ready: Prepared
    shared: "Shared"
    block: int
    frames: int
    changes: "Sequence[Changed]"
    hashes: tuple[str, ...]
    callback: str
    card: dict[str, object] = field(default_factory=dict)
    slots: tuple[int, ...] | None = None

    @property
    def places(self) -> Sequence[int]:
        """The slot of each lane in the host."""
        return range(len(self.ready.lanes)) if self.slots is None else self.slots


def record_writer(asked: Asked, rate: float, columns: int) -> "AudioWriter":
    """Of the file for what is heard."""
    from streamhost.files import AudioWriter

    assert asked.record is not None, "it was asked for"
    return AudioWriter(asked.record, rate=round(rate), channels=columns, subtype="float", overwrite=asked.force)


def document(run: Run) -> dict[str, object]:
    """As scripts read it."""
    from dataclasses import asdict

    from streamhost.host.figures import change_figures, guard_figures, lane_figures, run_figures

    ready, lanes = run.ready, []
    for number, (asked, preset, slot) in enumerate(zip(ready.lanes, ready.presets, run.places, strict=True)):
        realization = asked.realization
        figures = lane_figures(run.shared, slot, ready.channels * len(realization.outputs), ready.rate)
        lanes.append({
            "lane": number + 1, "preset": preset.source.name, "title": preset.title, "form": realization.form,
            "decomposition": realization.decomposition, "format": realization.format.label, **asdict(figures),
            "state_sha256": run.hashes[slot] if run.hashes else None,
        })
    return {
        **run_figures(run.shared, run.block, ready.rate), "frames": run.frames, "rate": ready.rate, "lanes": lanes,
        "changes": change_figures(run.changes), "guard": asdict(guard_figures(run.shared)), "callback": run.callback,
        **run.card,
    }


def told(run: Run) -> list[str]:
    """What happened, in a ledger and a few sentences."""
    from streamhost.host.figures import guard_figures, run_figures

    lines = [lane_ledger(run.ready, run.shared, run.places), ""]
    lines += [f"Lane {change.lane + 1} is heard from frame {change.frame} on, by {change.changeover}."
              for change in run.changes]
    figures, guard = run_figures(run.shared, run.block, run.ready.rate), guard_figures(run.shared)
    lines.append(f"{figures['blocks']} blocks of {run.block} frames: {block_times(figures)}.")
    if figures["output_gaps"] or figures["input_gaps"]:
        lines.append(gaps(figures))
    if guard.reason:
        lines.append(f"The guard has shut at frame {guard.frame}: {guard.reason} in lane {guard.lane + 1}.")
    if guard.held:
        lines.append(f"The ceiling held {guard.held} samples.")
    return lines


def lane_ledger(ready: Prepared, shared: "Shared", slots: Sequence[int], states: Sequence[str] = ()) -> str:
    """A row for each lane; `states` beside them where they are given."""
    from streamhost.host.figures import lane_figures

    rows: list[list[Cell]] = []
    for number, (asked, preset, slot) in enumerate(zip(ready.lanes, ready.presets, slots, strict=True)):
        realization = asked.realization
        figures = lane_figures(shared, slot, ready.channels * len(realization.outputs), ready.rate)
        about = f"{realization.form} · {realization.decomposition} · {realization.format.label}"
        rows.append([preset.title, about, figures.peak_dbfs, figures.rms_dbfs, figures.saturations + figures.wraps,
                     figures.load_percent, *states[number : number + 1]])
    columns = [Column("lane"), Column("form · decomposition · format"), Column("peak", "dBFS", 1), Column("rms", "dBFS", 1),
               Column("overflows"), Column("load", "%", 2)]
    return ledger([*columns, *([Column("state")] if states else [])], rows)


def block_times(figures: dict[str, object]) -> str:
    """Of `run_figures`."""
    return (f"half of them within {figures['step_p50_us']:.1f} us, 99.9 % within {figures['step_p999_us']:.1f} us, "
            f"all within {figures['step_max_us']:.1f} us of {figures['deadline_us']:.0f} us")


def gaps(figures: dict[str, object]) -> str:
    """Of `run_figures`."""
    return f"Gaps told by the card: {figures['output_gaps']} in the output, {figures['input_gaps']} in the input."
