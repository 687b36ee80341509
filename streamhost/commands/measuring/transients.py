"""What the instrument `transients` says, and the worst changes as audio."""

from collections.abc import Iterator, Sequence
from math import inf, isfinite

from streamhost.commands.common import MINUS, Column, ledger
from streamhost.commands.measuring.wave import Wave, change_waves
from streamhost.measure import Transient, Transients

CHANGES = (
    Column("worst change"), Column("by"), Column("on"), Column("peak", "dBFS", 1), Column("energy", "dBFS 1 s", 1),
    Column("within noise", "ms", 1), Column("click", "dBFS 468", 1), Column("heard", "dBFS 468", 1), Column("jump", "dBFS", 1),
)
MOST_NAMED = 3


def lines(result: Transients) -> Iterator[str]:
    """A ledger of the worst parameter change and of each change of form by each changeover, why some are missing, the rules."""
    rows = [_row(each) for each in _worst(result.changes)]
    if rows:
        yield ledger(CHANGES, rows, numbered=False)
    count = len({each.change for each in result.changes if each.kind == "parameter"})
    if result.peak_dbfs is not None and result.click_468_dbfs is not None:
        yield (f"By {result.changeover}, the worst of {count} parameter {'change' if count == 1 else 'changes'}: "
               f"peak {_level(result.peak_dbfs)}, click {_level(result.click_468_dbfs)} ({result.change}, {result.signal}).")
    else:
        yield f"No figure by {result.changeover}: {result.reason}."
    yield from _refusals(result.changes)
    if not rows:
        return
    level = f"{result.level_dbfs:g}".replace("-", MINUS)
    yield (f"Deviation from the new filter, had it run all along; constant and tone at {level} dBFS. Energy: 0 is a full-scale "
           f"sine of 1 s. Within noise: stays below {result.within_noise_factor:g} times the rms of the "
           f"{'predicted' if result.noise_is_predicted else 'measured'} noise; a dash: not by the end of the run.")
    yield ("Click: the deviation by ITU-R BS.468-4, weighted and quasi-peak; heard: the output itself, on a constant. Jump: "
           "the first frame less what would have come without the change.")


def _worst(changes: Sequence[Transient]) -> Iterator[Transient]:
    """Of parameters the worst click by each changeover; of forms the same for each form."""
    found: dict[tuple[str, str], Transient] = {}
    for each in changes:
        key = ("" if each.kind == "parameter" else each.change, each.changeover)
        if not each.reason and (key not in found or _click(each) > _click(found[key])):
            found[key] = each
    yield from found.values()


def _click(one: Transient) -> tuple[float, ...]:
    """By the deviation; where that is the same, by what is heard."""
    return tuple(-inf if level is None else level for level in (one.click_468_dbfs, one.heard_click_468_dbfs))


def _row(one: Transient) -> list[str | int | float | None]:
    by = one.changeover if one.over_ms is None else f"{one.changeover} {one.over_ms:g} ms"
    return [one.change, by, one.signal, one.peak_dbfs, one.energy_dbfs_s, one.settling_ms, one.click_468_dbfs,
            one.heard_click_468_dbfs, one.jump_dbfs]


def _refusals(changes: Sequence[Transient]) -> Iterator[str]:
    for reason in dict.fromkeys(each.reason for each in changes if each.reason):
        alike = [each for each in changes if each.reason == reason]
        by = dict.fromkeys(each.changeover for each in alike)
        yield f"No figures for {_listed([each.change for each in alike])} by {', '.join(by)}: {reason}."
    if clipped := [each.change for each in changes if each.clipped]:
        yield f"Carried states did not fit their word: {_listed(clipped)}."


def _listed(named: Sequence[str]) -> str:
    each = list(dict.fromkeys(named))
    return ", ".join(each[:MOST_NAMED]) + (f" and {len(each) - MOST_NAMED} more" if len(each) > MOST_NAMED else "")


def _level(dbfs: float) -> str:
    return (f"{dbfs:.1f}" if isfinite(dbfs) else str(dbfs).replace("inf", "\N{INFINITY}")).replace("-", MINUS) + " dBFS"


def waves(result: Transients) -> Iterator[Wave]:
    """Of each changeover the worst change, as it is heard and its deviation."""
    for trace in result.traces:
        yield from change_waves(trace.changeover, trace)
