"""What the instrument `tone` says."""

from collections.abc import Iterator, Sequence
from math import inf, isfinite

import numpy as np

from streamhost.commands.common import MINUS, Cell, Column, ledger
from streamhost.commands.measuring.wave import Wave
from streamhost.measure.measuring import listening_gain
from streamhost.measure.tones import Idle, Line, Setting, Tones

REFERENCE_HZ = 997.0


def waves(result: Tones) -> Iterator[Wave]:
    """One window of the tone to which most is added, and what is added, raised."""
    worst = result.worst_spectrum
    if worst is None:
        return
    yield Wave("worst", worst.samples)
    gain = listening_gain(float(np.abs(worst.difference).max()))
    if gain is not None:
        yield Wave(f"worst-difference-raised-{gain}-db", worst.difference * 10.0 ** (gain / 20.0))


def lines(result: Tones) -> Iterator[str]:
    """A ledger of THD+N by level and frequency, what the realization adds by itself, lines, idle tones, the method."""
    if not result.settings:
        yield f"No figures: {result.reason}."
        return
    for output in dict.fromkeys(each.output for each in result.settings):
        of_output = [each for each in result.settings if each.output == output]
        if output:
            yield f"{output}:"
        yield _table(of_output)
        yield from _said(of_output, floating=result.floating)
        yield from _idle([each for each in result.idle if each.output == output])
    if result.idle_reason:
        yield f"Idle tones: none were looked for: {result.idle_reason}."
    yield (f"THD+N is everything from 20 Hz to 20 kHz but the tone, over everything. One Hann window of {result.window_frames} "
           f"frames, {result.wait_frames} after the start. The ideal ran in {result.ideal}.")


def _table(settings: Sequence[Setting]) -> str:
    """A row a level, loudest first; details at the frequency nearest 997 Hz."""
    frequencies = sorted({each.hz for each in settings})
    place = {(each.level_dbfs, each.hz): each for each in settings}
    near = min(frequencies, key=lambda hz: abs(hz - REFERENCE_HZ))
    columns = [Column("level", "dBFS", 0), *(Column("THD+N, dB", _hertz(hz), 1) for hz in frequencies),
               Column("A-weighted", _hertz(near), 1), Column("THD", _hertz(near), 1), Column("of the input", _hertz(near), 1),
               Column("adds", "dBFS", 1)]
    rows: list[list[Cell]] = []
    for level in sorted({each.level_dbfs for each in settings}, reverse=True):
        row: list[Cell] = [level]
        each = [place.get((level, hz)) for hz in frequencies]
        row += [setting.thd_n_db if setting is not None else None for setting in each]
        at = place.get((level, near))
        row += [at.thd_n_a_db, at.thd_db, at.of_input_thd_n_db] if at is not None else [None] * 3
        row.append(max((setting.added_dbfs for setting in each if setting is not None and setting.added_dbfs is not None),
                       default=None))
        rows.append(row)
    return ledger(columns, rows, numbered=False)


def _said(settings: Sequence[Setting], *, floating: bool) -> Iterator[str]:
    yield from dict.fromkeys(f"{_tone(each)}: no figures: {each.reason}." for each in settings
                             if each.reason and each.added_dbfs is None)
    clean = [each for each in settings if not each.overflow_frames and each.added_dbfs is not None]
    loud = [each for each in settings if each.overflow_frames]
    silent = [each for each in settings if each.reason and each.added_dbfs is not None]
    if clean:
        yield _follows(clean) if floating else _adds(max(clean, key=_added))
        yield _own_line(clean)
    if silent:
        highest = max(each.level_dbfs for each in silent)
        yield f"Nothing comes out of {len(silent)} of {len(settings)} tones, from {_number(highest, 0)} dBFS down."
    if loud:
        worst = max(loud, key=lambda each: each.overflow_frames)
        found = f" and gives THD+N {_number(worst.thd_n_db)} dB" if worst.thd_n_db is not None else ""
        yield (f"Overflow: {len(loud)} of {len(settings)} tones, {_levels(loud)}. The worst, {_tone(worst)}, still overflows "
               f"after it has settled{found}.")


def _added(setting: Setting) -> float:
    return -inf if setting.added_dbfs is None else setting.added_dbfs


def _follows(settings: Sequence[Setting]) -> str:
    """In floating point."""
    worst = max(settings, key=lambda each: _added(each) - each.level_dbfs)
    below = worst.level_dbfs - _added(worst)
    if not isfinite(below):
        return "It adds nothing to a tone."
    return f"What it adds follows the tone and lies {below:.1f} dB or more below it, whatever its level; least {_tone(worst)}."


def _adds(worst: Setting) -> str:
    if not isfinite(_added(worst)):
        return "Where nothing overflows it adds nothing to a tone."
    said = f"Where nothing overflows it adds at most {_number(worst.added_dbfs)} dBFS to a tone, {_tone(worst)}"
    before = worst.of_input_residual_dbfs
    if before is None or not isfinite(before):
        return f"{said}; rounding the input makes nothing there."
    over = _added(worst) - before
    if abs(over) < 1.0:
        return f"{said}, as much as rounding the input makes there."
    return f"{said}, {abs(over):.0f} dB {'above' if over > 0 else 'below'} what rounding the input makes there."


def _own_line(settings: Sequence[Setting]) -> str:
    found = [(line, each) for each in settings for line in each.lines if line.source == "realization"]
    if not found:
        return "No line of its own stands out of the noise."
    line, setting = max(found, key=lambda pair: pair[0].dbfs)
    return f"Strongest line of its own: {_line(line)}, {_tone(setting)}."


def _line(line: Line) -> str:
    related = {"harmonic": f"harmonic {line.order}", "alias": f"alias of harmonic {line.order}",
               "neither": "neither a harmonic nor the alias of one"}[line.relation]
    return f"{_hertz(line.hz)}, {_number(line.dbfs)} dBFS, {related}, {line.over_floor_db:.0f} dB over the noise around it"


def _idle(each: Sequence[Idle]) -> Iterator[str]:
    if not each:
        return
    found = [idle for idle in each if idle.found]
    expected, alarm = each[0].expected_over_floor_db, each[0].alarm_over_floor_db
    chance = f"noise alone shows {expected:.1f} dB, and more than {alarm:.1f} once in 1,000"
    constants, tones = (
        [idle for idle in each if (idle.constant_lsb is not None) == constant] for constant in (True, False))
    if not found:
        yield f"Idle tones: none, on {len(constants)} constants and {len(tones)} tones of about a step ({chance})."
        return
    worst = max(found, key=lambda idle: idle.line.dbfs if idle.line is not None else -inf)
    assert worst.line is not None, "what is found is a line"
    of = f"a constant of {worst.constant_lsb:g}" if worst.constant_lsb is not None else f"a tone of {worst.tone_lsb:g}"
    yield (f"Idle tones: on {_share(constants)} constants and {_share(tones)} tones of about a step ({chance}). Strongest: "
           f"{_line(worst.line)}, on {of} LSB{', dithered' if worst.dithered else ''}.")


def _share(each: Sequence[Idle]) -> str:
    return f"{sum(idle.found for idle in each)} of {len(each)}"


def _levels(settings: Sequence[Setting]) -> str:
    least = min(each.level_dbfs for each in settings)
    return f"from {_number(least, 0)} dBFS up" if least < 0.0 else "at 0 dBFS"


def _tone(setting: Setting) -> str:
    return f"at {_hertz(setting.hz)} and {_number(setting.level_dbfs, 0)} dBFS"


def _hertz(hz: float) -> str:
    return f"{hz:.1f} Hz" if hz < 1000.0 else f"{hz:.0f} Hz"


def _number(value: float | None, decimals: int = 1) -> str:
    return "\N{EN DASH}" if value is None else f"{value:.{decimals}f}".replace("-", MINUS)
