"""All positions of a preset's knobs, at all its rates, and all turns from one to the next."""

from collections import defaultdict
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from math import inf

from streamhost.measure.changes.changing import NOT_KEPT, Changing
from streamhost.measure.changes.result import Trace
from streamhost.measure.changes.targets import TONE_HZ
from streamhost.measure.deviation import Deviation
from streamhost.measure.levels import peak_dbfs
from streamhost.measure.limits import limit_band
from streamhost.measure.settings.grid import Grid, grid_of
from streamhost.measure.settings.judging import Judged, deviation_of, judge
from streamhost.measure.settings.result import Setting, Table, Turn
from streamhost.measure.settings.turning import Pair, lengths, signals_of, turned_all
from streamhost.presets import Preset
from streamhost.program.native.kernel import kernel_source

Report = Callable[[float, str], None]

MOST, QUICK_MOST = 300, 24
"""Settings, of all rates together, unless the preset states the positions."""

MOST_TURNS = 10
"""The worst turns that are told one by one."""

FEW = 64
"""Pairs between two reports."""

JUDGING = 0.8
"""Of the time."""

NO_KNOBS = "the preset states no parameter that can be turned"


def table(preset: Preset, *, quick: bool = False, report: Report = lambda share, doing: None) -> Table:
    """The worst figures over the knobs' positions, and the worst click by `keep` between neighbours.

    Positions are those that the preset states, else about 300 about where the knobs stand (quick: 24 or so), at each of its
    rates. Each setting is realized; turns are tried on a constant and on a tone at the frequency of the filter, -20 dBFS.
    RequestError where the preset states more than 2000.
    """
    run = _Run(preset)
    grid = grid_of(preset, max(1, (QUICK_MOST if quick else MOST) // len(preset.rates)))
    if not grid.knobs:
        return run.result(grid, NO_KNOBS, complete=True)
    try:
        for number, rate in enumerate(preset.rates):
            run.at_rate(preset.at(rate), grid, _part(report, number, len(preset.rates)))
    except KeyboardInterrupt:
        return run.result(grid, "", complete=False)
    return run.result(grid, "", complete=True)


@dataclass
class _Run:
    """What has been found so far."""

    preset: Preset
    judged: list[Judged] = field(default_factory=list)
    turns: list[tuple[Turn, Pair | None]] = field(default_factory=list)

    def at_rate(self, preset: Preset, grid: Grid, report: Report) -> None:
        """All settings, then all turns, of one rate."""
        band = limit_band(preset.limits, preset.rate)
        here: list[Judged] = []
        for place, point in enumerate(grid.points):
            report(JUDGING * place / len(grid.points), f"setting {place + 1} of {len(grid.points)}")
            here.append(judge(preset, grid, point, band))
            self.judged.append(here[-1])
        groups: dict[tuple[str, str], list[tuple[int, int]]] = defaultdict(list)
        kernels = [_kernel_of(each) for each in here]
        for first, second in grid.pairs:
            (key, text), (other_key, other_text) = kernels[first], kernels[second]
            if not (text and other_text):
                continue
            if key == other_key:
                groups[text, other_text].append((first, second))
            else:
                self.turns.append((Turn(preset.rate, *grid.turn(first, second), "", None, None, NOT_KEPT), None))
        done, count = 0, sum(map(len, groups.values()))
        for pairs in groups.values():
            for begins in range(0, len(pairs), FEW):
                report(JUDGING + (1.0 - JUDGING) * done / count, f"turn {done + 1} of {count}")
                self._tried(here, grid, pairs[begins : begins + FEW])
                done += len(pairs[begins : begins + FEW])

    def _tried(self, here: Sequence[Judged], grid: Grid, indices: Sequence[tuple[int, int]]) -> None:
        pairs = [_pair(here, grid, first, second) for first, second in indices]
        for (first, second), pair, found in zip(indices, pairs, turned_all(pairs), strict=True):
            self.turns.append((Turn(pair.first.rate, *grid.turn(first, second), found.signal, peak_dbfs(found.peak),
                                    peak_dbfs(found.click)), pair))

    def result(self, grid: Grid, reason: str, *, complete: bool) -> Table:
        settings, several = [each.setting for each in self.judged], len(self.preset.rates) > 1
        noisy = _worst(self.judged, lambda one: one.noise_dbfs)
        tight = _worst(self.judged, lambda one: None if one.headroom_db is None else -one.headroom_db)
        off = _worst(self.judged, lambda one: one.deviation_db)
        exact = self._exact(off) if off is not None else None
        kept = sorted(((turn, pair) for turn, pair in self.turns if pair is not None), key=lambda both: -_level(both[0]))
        loud = kept[0][0] if kept else None
        high = max((turn for turn, _ in kept), key=lambda turn: turn.peak_dbfs or -inf, default=None)
        return Table(
            settings=len(settings),
            noise_dbfs=noisy.setting.noise_dbfs if noisy else None, noise_at=_said(noisy, several),
            headroom_db=tight.setting.headroom_db if tight else None,
            headroom_register=tight.setting.headroom_register if tight else "", headroom_at=_said(tight, several),
            deviation_db=exact.db if exact else None, deviation_hz=exact.hz if exact else None,
            deviation_at=_said(off, several),
            unstable=sum(one.stability == "unstable" for one in settings),
            marginal=sum(one.stability == "marginal" for one in settings), refused=sum(bool(one.refused) for one in settings),
            turns=len(self.turns), not_kept=len(self.turns) - len(kept),
            click_468_dbfs=loud.click_468_dbfs if loud else None, click_at=_turn_said(loud, several),
            click_signal=loud.signal if loud else "",
            peak_dbfs=high.peak_dbfs if high else None, peak_at=_turn_said(high, several),
            steps=grid.steps, reason=reason, complete=complete, positions=tuple(settings),
            worst_turns=tuple(turn for turn, _ in kept[:MOST_TURNS]),
            trace=_trace(*kept[0], several) if kept else None,
        )

    def _exact(self, judged: Judged) -> Deviation:
        assert judged.realization is not None, "what has a figure is realized"
        return deviation_of(judged.realization, limit_band(self.preset.limits, judged.setting.rate_hz), zoomed=True)


def _part(report: Report, number: int, count: int) -> Report:
    """Of one of several parts."""
    return lambda share, doing: report((number + share) / count, doing)


def _level(turn: Turn) -> float:
    return -inf if turn.click_468_dbfs is None else turn.click_468_dbfs


def _worst(judged: Sequence[Judged], figure: Callable[[Setting], float | None]) -> Judged | None:
    given = [(value, -place) for place, one in enumerate(judged) if (value := figure(one.setting)) is not None]
    return judged[-max(given)[1]] if given else None


def _said(judged: Judged | None, several: bool) -> str:
    if judged is None:
        return ""
    return f"{judged.setting.said} at {judged.setting.rate_hz:g} Hz" if several else judged.setting.said


def _turn_said(turn: Turn | None, several: bool) -> str:
    if turn is None:
        return ""
    said = f"{turn.change}, {turn.at}" if turn.at else turn.change
    return f"{said} at {turn.rate_hz:g} Hz" if several else said


def _kernel_of(judged: Judged) -> tuple[str, str]:
    """What a state belongs to, and the kernel's text; empty where a setting is not stable."""
    if judged.realization is None or judged.setting.stability != "stable":
        return "", ""
    return judged.realization.program.key, kernel_source(judged.realization.program)


def _pair(here: Sequence[Judged], grid: Grid, first: int, second: int) -> Pair:
    before, after = here[first], here[second]
    assert before.realization is not None and after.realization is not None, "a stable setting is realized"
    turned = [knob for knob, a, b in zip(grid.knobs, grid.points[first], grid.points[second], strict=True) if a != b]
    hertz = next((position for knob, position in zip(grid.knobs, grid.points[first], strict=True)
                  if knob.name == "frequency" and knob.filter == turned[0].filter), TONE_HZ)
    return Pair(before.realization, after.realization, hertz[0] if isinstance(hertz, tuple) else hertz,
                max(before.settling, after.settling))


def _trace(turn: Turn, pair: Pair | None, several: bool) -> Trace | None:
    """The worst turn once more, alone."""
    assert pair is not None, "a turn that was kept has its pair"
    before, after = lengths(pair.settling, pair.first.rate)
    excerpts = next(each for each in signals_of(pair, before, after) if each.name == turn.signal)
    change = Changing(pair.first, pair.second).on(excerpts.x, before)
    heard, _ = change.after("keep", 0)
    column = int(abs(heard - change.target[before:]).max(axis=0).argmax())
    return Trace.of((_turn_said(turn, several), excerpts.name, "keep"), before, heard[:, column], change.before[:, column],
                    change.target[:, column])
