"""What the instrument `table` says, and its worst turn as audio."""

from collections.abc import Callable, Iterator

from streamhost.commands.common import Column, ledger
from streamhost.commands.measuring.wave import Wave, change_waves
from streamhost.measure import Setting, Table

WORST = (Column("worst"), Column("figure", "", 2), Column("unit"), Column("where"))
MOST_NAMED = 4


def lines(result: Table) -> Iterator[str]:
    """A ledger of the worst figures and where they are; what is not stable, refused or cannot be kept; the steps."""
    if result.reason:
        yield f"Not asked: {result.reason}."
        return
    rows: list[list[str | int | float | None]] = [
        ["noise, predicted", result.noise_dbfs, "dBFS", result.noise_at],
        ["headroom", result.headroom_db, "dB", _beside(result.headroom_at, result.headroom_register)],
        ["response off", result.deviation_db, "dB",
         _beside(result.deviation_at, "" if result.deviation_hz is None else f"{result.deviation_hz:g} Hz")],
        ["click by keep", result.click_468_dbfs, "dBFS 468", _beside(result.click_at, result.click_signal)],
        ["peak by keep", result.peak_dbfs, "dBFS", result.peak_at],
    ]
    yield ledger(WORST, [row for row in rows if row[1] is not None], numbered=False)
    yield (f"{result.settings} settings, {result.turns} turns to a neighbour: {result.unstable} unstable, {result.marginal} "
           f"marginal with coefficients rounded, {result.refused} refused.")
    yield from _named("Unstable", result, lambda one: one.stability == "unstable")
    yield from _named("Marginal", result, lambda one: one.stability == "marginal")
    refusals = list(dict.fromkeys(one.refused for one in result.positions if one.refused))
    yield from (f"Refused: {each}." for each in refusals[:MOST_NAMED])
    if result.not_kept:
        yield f"In {result.not_kept} turns the state cannot be kept: words differ."
    yield f"Positions: {result.steps}."


def _beside(where: str, what: str) -> str:
    return f"{where}: {what}" if what else where


def _named(head: str, result: Table, which: Callable[[Setting], bool]) -> Iterator[str]:
    found = [one for one in result.positions if which(one)]
    rates = len({one.rate_hz for one in result.positions}) > 1
    named = "; ".join(f"{one.said} at {one.rate_hz:g} Hz" if rates else one.said for one in found[:MOST_NAMED])
    if found:
        yield f"{head}: {named}{f'; and {len(found) - MOST_NAMED} more' if len(found) > MOST_NAMED else ''}."


def waves(result: Table) -> Iterator[Wave]:
    """The turn with the worst click, as it is heard and its deviation."""
    if result.trace is not None:
        yield from change_waves("keep", result.trace)
