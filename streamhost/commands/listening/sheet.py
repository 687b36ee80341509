"""The ledger of a running host as text: the sentence, the output, the lanes, block times, the last notice."""

from typing import TYPE_CHECKING

from streamhost.commands.common import MINUS, printable
from streamhost.commands.listening.asked import Prepared
from streamhost.commands.listening.told import block_times, gaps, lane_ledger

if TYPE_CHECKING:
    from streamhost.live.controls import Controls

SCALE, LOWEST_DB = 41, -60.0
REVERSE, PLAIN = "\x1b[7m", "\x1b[0m"
ALARMS = ("card lost, looking", "guard shut")

KEYS = (
    "1 to 9, 0   hear lanes 1 to 10          b   back to the lane before\n"
    "h           how a change takes over     d   difference, D against exact or before\n"
    "< >         difference 6 dB down, up    + - monitor 1 dB up, down\n"
    "space       mute, always                u   come up by ramp\n"
    "?           these keys, and away        q   quit"
)


def sheet(ready: Prepared, controls: "Controls", *, keys: bool) -> str:
    """All lines."""
    from streamhost.host.figures import run_figures

    card = controls.card
    figures = run_figures(card.shared, card.recipe.block, ready.rate)
    states = ["heard" if slot == card.heard else "ready" for slot in controls.slots]
    return "\n".join([
        *_sentence(ready, controls), "", _output(controls), "", lane_ledger(ready, card.shared, controls.slots, states), "",
        f"Block times: {block_times(figures)}; {figures['blocks_over_half']} over half.", gaps(figures), "",
        *(KEYS.splitlines() if keys else []), f"{printable(controls.notice)}   ? all keys",
    ])


def _sentence(ready: Prepared, controls: "Controls") -> list[str]:
    text = ready.input.text
    named = f"{text}, looped" if ready.input.samples is not None else "the card's input" if text == "device" else text
    against = "exact" if controls.against == "ideal" else f"lane {controls.before + 1}"
    differs = f"the difference from {against} is raised by {controls.raise_db:g} dB" if controls.differs else (
        "the difference is not heard")
    place = printable(controls.card.opened.device)
    level = _decibels(controls.monitor_db)
    return [f"You hear lane {controls.number_of(controls.card.heard) + 1} on {printable(named)} at {level} dB, on {place}.",
            f"A change takes over by {controls.changeover}; {differs}."]


def _output(controls: "Controls") -> str:
    """The state, and the level that goes out on a scale from -60 to 0 dBFS: a tick at its peak."""
    from streamhost.host.figures import decibels, guard_figures

    shared, said = controls.card.shared, controls.card.said
    guard = guard_figures(shared)
    if said == "guard shut":
        said += f": {guard.reason}"
    if said.startswith(ALARMS):
        said = f"{REVERSE} {said} {PLAIN}"
    peak = decibels(float(shared.meters["shown_peak"][0]))
    place = round((max(peak, LOWEST_DB) - LOWEST_DB) / -LOWEST_DB * (SCALE - 1))
    bar = list("├" + "─" * (SCALE - 2) + "┤")
    bar[min(place, SCALE - 1)] = "┼"
    held = "   guard holding" if guard.held else ""
    return f"Output: {said}   {MINUS}60 {''.join(bar)} 0 dBFS   peak {_decibels(peak)}{held}"


def _decibels(value: float) -> str:
    if value <= LOWEST_DB * 3:
        return f"{MINUS}\N{INFINITY}"
    return f"{value:.1f}".replace("-", MINUS)
