"""What is said of limits: a sentence for each that is missed, and the same figures for a program."""

from collections.abc import Sequence

from streamhost.commands.common import MINUS
from streamhost.measure.limits import AT_LEAST, PEAK_DBFS, SECONDS, SEED, Verdict

MOST_DECIMALS, ALL_DECIMALS = 2, 17
SIGNAL = f"{SECONDS:g} s of uniform white noise, peak {f'{PEAK_DBFS:g}'.replace('-', MINUS)} dBFS, seed {SEED}"


def miss(verdict: Verdict) -> str:
    """The limit that is missed, with what was found beside what is allowed."""
    allowed = f"{verdict.rule} {signed(verdict.allowed)} {verdict.unit}".rstrip()
    key = f"{verdict.key} of {verdict.output}" if verdict.output else verdict.key
    if verdict.found is None:
        return f"{key}, {allowed}: no figure, since {verdict.reason}"
    about = f" ({verdict.about})" if verdict.about else ""
    return f"{key}: {_beside(verdict)}, {allowed}{about}"


def _beside(verdict: Verdict) -> str:
    """A figure that misses, with one decimal more than its limit has, at most two, unless that hides the miss."""
    found, allowed = verdict.found, verdict.allowed
    assert found is not None, "without a figure nothing stands beside the limit"
    decimals = min(MOST_DECIMALS, len(f"{allowed:f}".rstrip("0").partition(".")[2]) + 1)
    if found.is_integer() and allowed.is_integer():
        decimals = 0
    while _hidden(round(found, decimals), verdict) and decimals < ALL_DECIMALS:
        decimals += 1
    return f"{found:.{decimals}f}".replace("-", MINUS)


def _hidden(shown: float, verdict: Verdict) -> bool:
    return shown >= verdict.allowed if verdict.rule == AT_LEAST else shown <= verdict.allowed


def signed(number: float) -> str:
    """A number with as few digits as it has, and a minus that is one."""
    return f"{number:g}".replace("-", MINUS)


def document(verdicts: Sequence[Verdict]) -> list[dict[str, object]]:
    """What was found and what is allowed, each in `unit`; `rule` tells whether that is at most or at least."""
    return [
        {"key": each.key, "output": each.output, "found": each.found, "allowed": each.allowed, "unit": each.unit,
         "rule": each.rule, "meets": each.meets, "about": each.about, "reason": each.reason}
        for each in verdicts
    ]
