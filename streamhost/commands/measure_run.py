"""A run of instruments: one after the other, with progress; what is done stays when it is broken off."""

from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Any

from streamhost.commands.common import Progress
from streamhost.commands.instruments import INSTRUMENTS, Asked, Instrument, limit_verdicts
from streamhost.commands.measure_waves import WaveFolder
from streamhost.errors import RequestError, nearest
from streamhost.measure.limits import Verdict, stated_limits


@dataclass
class Found:
    """What a run found: results by instrument, verdicts, and the audio files it wrote.

    broken_off: instruments that were broken off or not begun; those with a result have a part of it. not_asked: stated
    limits of instruments that did not run.
    """

    results: dict[str, Any] = field(default_factory=dict)
    verdicts: tuple[Verdict, ...] = ()
    files: list[Path] = field(default_factory=list)
    broken_off: list[str] = field(default_factory=list)
    not_asked: tuple[str, ...] = ()


def chosen(only: str | None) -> tuple[Instrument, ...]:
    """The instruments named, in their own order; all of them unless some are named. RequestError for an unknown name."""
    if only is None:
        return INSTRUMENTS
    known = [instrument.name for instrument in INSTRUMENTS]
    names = [name.strip() for name in only.split(",")]
    for name in names:
        if name not in known:
            raise RequestError(f'--only {only}: there is no instrument "{name}": {", ".join(known)}.{nearest(name, known)}')
    return tuple(instrument for instrument in INSTRUMENTS if instrument.name in names)


def measured(asked: Asked, instruments: Sequence[Instrument], waves: WaveFolder, *, on_limit_signal: bool) -> Found:
    """Run the instruments, write their audio, then check the limits that they answer.

    on_limit_signal: x is the signal that limits are checked on, so that results are good for them.
    """
    found = Found()
    with Progress("measure", len(instruments), [instrument.seconds for instrument in instruments]) as progress:
        for place, instrument in enumerate(instruments):
            progress.step(instrument.name)
            try:
                result = instrument.run(replace(asked, report=progress.within))
                found.files += waves.write(instrument, result)
            except KeyboardInterrupt:
                found.broken_off = [left.name for left in instruments[place:]]
                break
            found.results[instrument.name] = result
            if not getattr(result, "complete", True):
                found.broken_off = [left.name for left in instruments[place:]]
                break
    _check_limits(found, asked, instruments, on_limit_signal)
    return found


def _check_limits(found: Found, asked: Asked, instruments: Sequence[Instrument], on_limit_signal: bool) -> None:
    """After a run that was broken off, only what needs no further run."""
    answered = {"", *(instrument.name for instrument in instruments)}
    good = {each.name for each in instruments if on_limit_signal and (each.quick_judges or not asked.quick)}
    known = {name: result for name, result in found.results.items() if name in good - set(found.broken_off)}
    if found.broken_off:
        answered = {"", *known}
    stated = stated_limits(asked.preset.limits)
    asked_for = {limit.key for limit in stated if limit.instrument in answered}
    found.not_asked = tuple(limit.key for limit in stated if limit.key not in asked_for)
    preset = replace(asked.preset, limits={key: value for key, value in asked.preset.limits.items()
                                           if key not in found.not_asked})
    found.verdicts = limit_verdicts(preset, asked.realization, known)
