"""Distortion of tones against level and frequency, and tones where there should be none."""

from collections.abc import Callable, Sequence
from dataclasses import replace
from math import inf

from streamhost.formats import Float
from streamhost.measure.deviation import Responses
from streamhost.measure.tones.coherent import REFERENCE_HZ, tone_bins, window_frames
from streamhost.measure.tones.idling import SEED, IdleSearch, stills
from streamhost.measure.tones.periodogram import FALSE_ALARM
from streamhost.measure.tones.result import Idle, Setting, Tones, WorstSpectrum
from streamhost.measure.tones.setting import measured_setting
from streamhost.measure.tones.steady import LONGEST_WAIT_S, SteadyRun
from streamhost.realization import Realization

Report = Callable[[float, str], None]

LEVELS_DBFS = (0.0, -20.0, -40.0, -60.0, -80.0, -90.0, -100.0)
QUICK_LEVELS_DBFS = (0.0, -20.0, -60.0, -90.0)
LIMIT_DBFS = -20.0
"""The level whose THD+N is the instrument's one figure: with headroom, as the noise on which limits are checked."""

NO_STEP = "floating point has no step for a constant or a tone to lie between"


def tone(
    realization: Realization, levels_dbfs: Sequence[float] | None = None, *, quick: bool = False, idle: bool = True,
    report: Report = lambda share, doing: None,
) -> Tones:
    """THD, THD+N and spurious lines of tones, and idle tones.

    levels_dbfs: peaks, at most 0; -20 is measured always. quick: fewer levels, and a quarter of the window. idle:
    look for idle tones too. report: is told the share of the work that is done, and what is being done.
    """
    wanted = levels_dbfs if levels_dbfs is not None else QUICK_LEVELS_DBFS if quick else LEVELS_DBFS
    search = _Search(realization, tuple(sorted({*wanted, LIMIT_DBFS}, reverse=True)), quick, report)
    if search.run.wait is not None:
        search.go(idle)
    return search.result(idle)


class _Search:
    """What is done so far; a run that is broken off keeps it."""

    def __init__(self, realization: Realization, levels: Sequence[float], quick: bool, report: Report) -> None:
        self.run = SteadyRun(realization, window_frames(realization.rate, quick))
        self._realization, self._levels, self._report = realization, levels, report
        self._settings: list[Setting] = []
        self._idle: list[Idle] = []
        self._worst: tuple[Setting, WorstSpectrum] | None = None
        self._complete, self._done, self._all = True, 0, 1

    def go(self, idle: bool) -> None:
        outputs = range(len(self._realization.outputs))
        idle = idle and not isinstance(self._realization.format, Float)
        try:
            bins = [tone_bins(Responses(self._realization, 0, (output,)), self.run.window) for output in outputs]
            still = tuple(stills()) if idle else ()
            self._all = sum(len(each) * len(self._levels) + bool(each) * len(still) for each in bins)
            for output in outputs:
                self._tones(output, bins[output])
            for output in outputs if still else ():
                self._stills(output, bins[output])
        except KeyboardInterrupt:
            self._complete = False

    def _tones(self, output: int, bins: Sequence[int]) -> None:
        for bin in bins:
            for level in self._levels:
                hz = bin * self._realization.rate / self.run.window
                self._tell(f"{hz:.0f} Hz at {level:g} dBFS")
                setting, spectrum = measured_setting(self.run, output, bin, level)
                self._settings.append(setting)
                if spectrum is not None and (self._worst is None or _badness(setting) > _badness(self._worst[0])):
                    self._worst = setting, spectrum

    def _stills(self, output: int, bins: Sequence[int]) -> None:
        if not bins:
            return
        reference = REFERENCE_HZ * self.run.window / self._realization.rate
        search = IdleSearch(self.run, output, min(bins, key=lambda bin: abs(bin - reference)))
        for still in stills():
            self._tell("idle tones")
            found = search.idle(still)
            if found is not None:
                self._idle.append(found)

    def _tell(self, doing: str) -> None:
        self._report(self._done / self._all, doing)
        self._done += 1

    def result(self, idle: bool) -> Tones:
        run = self.run
        idle_reason = "not asked for" if not idle else NO_STEP if isinstance(self._realization.format, Float) else ""
        worst = self._worst[0] if self._worst is not None else None
        found = Tones(
            thd_n_db=None,
            thd_n_level_dbfs=LIMIT_DBFS,
            thd_n_hz=None,
            added_dbfs=worst.added_dbfs if worst is not None else None,
            worst=worst,
            window_frames=run.window,
            spacing_hz=self._realization.rate / run.window,
            wait_frames=run.wait,
            false_alarm=FALSE_ALARM,
            seed=SEED,
            settings=tuple(self._settings),
            idle=tuple(self._idle),
            idle_reason=idle_reason or ("" if run.wait is not None else self._why_none()),
            ideal=run.ideal,
            floating=isinstance(self._realization.format, Float),
            complete=self._complete,
            reason=self._why_none() if not self._settings else "",
            worst_spectrum=self._worst[1] if self._worst is not None else None,
        )
        judged = max(found.judged, key=lambda each: inf if each.thd_n_db is None else each.thd_n_db, default=None)
        if judged is None:
            return found
        return replace(found, thd_n_db=judged.thd_n_db, thd_n_hz=judged.hz, reason=judged.reason)

    def _why_none(self) -> str:
        if self.run.wait is None:
            return f"with its coefficients rounded the filter does not settle within {LONGEST_WAIT_S:g} s"
        return "nothing passes in the audio band" if self._complete else "broken off before the first"


def _badness(setting: Setting) -> tuple[bool, float]:
    """What overflows is another matter, and is the worst only where everything does."""
    return not setting.overflow_frames, -inf if setting.added_dbfs is None else setting.added_dbfs
