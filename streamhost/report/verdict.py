"""The verdict as a sentence."""

from collections.abc import Sequence

from streamhost.report.contents import Contents, Lane, noise_of
from streamhost.report.words import NO_BREAK, counted, number, ranges


def verdict(contents: Contents) -> str:
    """What a reader must know who reads no further."""
    lanes = contents.lanes
    asked = [lane for lane in lanes if lane.states_limits]
    if len(lanes) == 1:
        return _verdict_of_one(lanes[0])
    if not asked:
        return f"No limits are stated: not asked. {_quietest(lanes)}".strip()
    met = [lane.number for lane in asked if lane.meets]
    said = f"{counted(len(met))} of {counted(len(lanes))} {'meets' if len(met) == 1 else 'meet'} every limit" + (
        f": {ranges(met)}" if met and len(met) < len(lanes) else "")
    missed = [lane.number for lane in asked if lane.misses]
    misses = f"; {ranges(missed)} {'misses' if len(missed) == 1 else 'miss'} one or more" if missed else ""
    chosen = [lane for lane in asked if lane.meets] or asked
    return f"{said[:1].upper()}{said[1:]}{misses}{_rest(lanes)}. {_quietest(chosen)}".strip()


def _verdict_of_one(lane: Lane) -> str:
    if not lane.verdicts:
        return f"{lane.title}: no limits are stated, not asked."
    missed, total = len(lane.misses), len(lane.verdicts)
    if not missed:
        every = {1: "its limit", 2: "both limits"}.get(total, f"all {counted(total)} limits")
        return f"{lane.title} meets {every}."
    return f"{lane.title} misses {'its limit' if total == 1 else f'{counted(missed)} of {counted(total)} limits'}."


def _rest(lanes: Sequence[Lane]) -> str:
    """Those that state none, held against the limits of the others."""
    silent = [lane for lane in lanes if not lane.states_limits]
    missing, keeping = [lane.number for lane in silent if lane.misses], [lane.number for lane in silent if lane.meets]
    single, parts = all(len(lane.verdicts) < 2 for lane in lanes), []
    if missing:
        parts.append(f"{ranges(missing)}, not asked, would miss {'it' if single else 'one or more'}")
    if keeping:
        parts.append(f"{ranges(keeping)}, not asked, would meet {'it' if single else 'them'}")
    if others := [lane.number for lane in silent if not lane.verdicts]:
        parts.append(f"{ranges(others)} {'is' if len(others) == 1 else 'are'} not asked")
    return "".join(f"; {part}" for part in parts)


def _quietest(lanes: Sequence[Lane]) -> str:
    lane = min(lanes, key=noise_of, default=None)
    if lane is None or len(lanes) < 2 or noise_of(lane) == float("inf"):
        return ""
    which = "these" if len(lanes) > 2 else "the two"
    return f"Of {which}, {lane.number} has the least noise: {number(noise_of(lane))}{NO_BREAK}dBFS."
