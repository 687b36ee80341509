"""Changes of parameters and of form at a frame: what each does to the output."""

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, field, replace
from math import inf, isfinite

import numpy as np
from numpy.typing import NDArray

from streamhost.diagram.norms import settling_frames
from streamhost.errors import RequestError
from streamhost.formats import Fixed
from streamhost.host.banks import ramp
from streamhost.host.plan import FADE_S
from streamhost.host.records import BANK_FRAMES
from streamhost.measure.changes import signals
from streamhost.measure.changes.changing import RAMP, Change, Changing
from streamhost.measure.changes.figures import Figures, figures, heard_click
from streamhost.measure.changes.result import Trace, Transient, Transients
from streamhost.measure.changes.targets import Target, form_targets
from streamhost.measure.levels import decibels, peak_dbfs
from streamhost.measure.limits import limit_signal
from streamhost.measure.predicted import predicted_full_noise
from streamhost.measure.running import Run
from streamhost.presets.tables import CHANGEOVERS
from streamhost.realization import Realization

FloatArray = NDArray[np.float64]
Report = Callable[[float, str], None]

WITHIN_NOISE = 8.0
"""Times the rms of the noise, 18 dB: the difference of two runs has 1.41 times that rms, and stays below 5.7 times its own."""

LONGEST_S, QUICK_S = 4.0, 1.0
SHORTEST_S = 0.1
BEYOND = 1.5
"""Settling times that are listened to after a change, settled being 120 dB down."""

SELDOM = ("carry", RAMP)
"""In a quick run tried for the worst parameter change alone: they take longest to prepare."""

NO_PARAMETER = "there is no parameter to turn"
UNSTABLE = "one of the two filters does not settle"


def transients(
    realization: Realization, x: FloatArray | None = None, *, targets: Sequence[Target] | None = None, frame: int | None = None,
    changeover: str = "keep", over_ms: float = 1000.0 * FADE_S, quick: bool = False, judged_only: bool = False,
    report: Report = lambda share, doing: None,
) -> Transients:
    """What comes of changing a realization to each target (other forms, unless given) by each changeover.

    On a constant, a tone and a recording x (frames, channels), unless given the noise on which limits are checked; that is
    changed at eight places, or at `frame`. changeover: the one that is judged, in the figures of the result itself. over_ms: of
    fades and ramps. quick: shorter runs, a recording in one place, carry and ramp of the worst parameter change alone.
    judged_only: parameter changes by the judged changeover, and nothing else.
    Raises RequestError for another changeover, a frame that is not in x, a target with other outputs or rate.
    """
    targets = form_targets(realization) if targets is None else targets
    recorded = limit_signal(realization.rate) if x is None else x
    _check(realization, recorded, targets, frame, changeover)
    if judged_only:
        targets = [target for target in targets if target.kind == "parameter"]
    run = _Run(realization, recorded, frame, changeover, over_ms, quick)
    try:
        for k, target in enumerate(targets):
            for share, doing in run.tried(target, (changeover,) if judged_only else CHANGEOVERS):
                report((k + share) / len(targets), doing)
        if quick and not judged_only:
            run.again(targets)
    except KeyboardInterrupt:
        return run.result(complete=False)
    return run.result(complete=True)


def _check(realization: Realization, x: FloatArray, targets: Sequence[Target], frame: int | None, changeover: str) -> None:
    if changeover not in CHANGEOVERS:
        raise RequestError(f'There is no changeover "{changeover}": {", ".join(CHANGEOVERS)}.')
    if frame is not None and not 0 <= frame < len(x):
        raise RequestError(f"frame = {frame}: a change is at a frame of the signal, from 0 to {len(x) - 1}.")
    for target in targets:
        other = target.realization
        if other is not None and (other.rate, len(other.outputs)) != (realization.rate, len(realization.outputs)):
            raise RequestError(f"{target.change}: both have the same rate and as many outputs.")


@dataclass
class _Run:
    """What has been found so far."""

    realization: Realization
    recorded: FloatArray
    frame: int | None
    judged: str
    over_ms: float
    quick: bool
    found: list[Transient] = field(default_factory=list)
    worst: dict[str, tuple[float, Trace]] = field(default_factory=dict)

    @property
    def over(self) -> int:
        return max(1, round(self.over_ms * self.realization.rate / 1000.0))

    def again(self, targets: Sequence[Target]) -> None:
        """What takes long, of the worst parameter change alone."""
        kept = [each for each in self.found if each.kind == "parameter" and each.changeover == "keep" and not each.reason]
        worst = max(kept, key=_click, default=None)
        for target in targets:
            if worst is not None and target.change == worst.change:
                self.quick = False
                for _ in self.tried(target, [each for each in SELDOM if each != self.judged]):
                    pass
                self.quick = True

    def tried(self, target: Target, changeovers: Sequence[str]) -> Iterator[tuple[float, str]]:
        """Try a target; gives the share done, and of what."""
        wanted = [each for each in changeovers if not self.quick or each not in SELDOM or each == self.judged]
        wanted = [each for each in wanted if each != RAMP or target.between is not None]
        other = target.realization
        reason = target.reason if other is None else UNSTABLE if self.realization.unstable or other.unstable else ""
        if other is None or reason:
            self.found += [self._nothing(target, each, reason) for each in wanted]
            return
        yield 0.0, target.change
        changing = Changing(self.realization, other, self._ramp(target) if RAMP in wanted else ())
        refused = {each: why for each in wanted if (why := changing.why_not(each))}
        self.found += [self._nothing(target, each, why) for each, why in refused.items()]
        before, after = self._lengths(other)
        rms = _noise_rms(other, self.recorded)
        tried = list(self._excerpts(target, before, after))
        for k, excerpts in enumerate(tried):
            change = changing.on(excerpts.x, before)
            for each in wanted:
                yield k / len(tried), target.change
                if each not in refused:
                    self._one(target, excerpts, change, each, rms)

    def _ramp(self, target: Target) -> list[Realization]:
        """The realizations on the way, one every 32 frames, the target last."""
        assert target.between is not None, "only a parameter has a way"
        return ramp(target.between, 0.0, 1.0, self.over)

    def _lengths(self, other: Realization) -> tuple[int, int]:
        """Frames before and after the change: until what was is forgotten, then until what comes of it is."""
        rate = self.realization.rate
        settling = max(settling_frames(each.program.diagram, channel) for each in (self.realization, other)
                       for channel in range(each.diagram.channels))
        longest = (QUICK_S if self.quick else LONGEST_S) * rate / 2.0
        before = -(-round(min(max(settling, SHORTEST_S * rate), longest)) // BANK_FRAMES) * BANK_FRAMES
        return before, self.over + round(min(max(BEYOND * settling, SHORTEST_S * rate), longest))

    def _excerpts(self, target: Target, before: int, after: int) -> Iterator[signals.Excerpts]:
        channels = self.realization.diagram.channels
        columns = channels if channels > 1 else None
        frame = len(self.recorded) // 2 if self.quick and self.frame is None else self.frame
        yield signals.constant(before, after, columns or 1)
        yield signals.tone(before, after, target.tone_hz, self.realization.rate, columns)
        yield signals.recording(self.recorded, before, after, frame, columns)

    def _one(self, target: Target, excerpts: signals.Excerpts, change: Change, changeover: str, rms: float | None) -> None:
        heard, clipped = change.after(changeover, self.over)
        at, rate = change.frame, self.realization.rate
        with np.errstate(over="ignore", invalid="ignore"):  # what overflows in floating point has run away
            told = figures(heard - change.target[at:], WITHIN_NOISE * (rms or 0.0), rate)
            jump = float(np.abs(heard[0] - change.before[at]).max())
        column = int(np.argmax(told.click))
        place = excerpts.frames[column % excerpts.x.shape[1]] if excerpts.frames is not None else None
        one = self._figures(self._nothing(target, changeover, ""), told, len(heard), rms is not None)
        self.found.append(replace(
            one, signal=excerpts.name, frame=place, jump_dbfs=peak_dbfs(jump), clipped=clipped,
            heard_click_468_dbfs=peak_dbfs(heard_click(change.before[at - 1], heard, rate)) if excerpts.constant else None,
            noise_dbfs=None if rms is None else decibels(2.0 * rms**2),
        ))
        click = float(told.click[column])
        if changeover not in self.worst or click > self.worst[changeover][0]:
            self.worst[changeover] = click, Trace.of(
                (target.change, excerpts.name, changeover), at, heard[:, column], change.before[:, column],
                change.target[:, column])

    def _figures(self, empty: Transient, told: Figures, frames: int, noise_is_known: bool) -> Transient:
        settling = int(told.settling.max())
        settled = noise_is_known and settling < frames
        return replace(
            empty, peak_dbfs=peak_dbfs(float(told.peak.max())), energy_dbfs_s=decibels(float(told.energy.max())),
            settling_frames=settling if settled else None,
            settling_ms=1000.0 * settling / self.realization.rate if settled else None,
            click_468_dbfs=peak_dbfs(float(told.click.max())),
        )

    def _nothing(self, target: Target, changeover: str, reason: str) -> Transient:
        over = self.over_ms if changeover in ("fade", RAMP) else None
        return Transient(target.change, target.kind, "", changeover, over, *(None,) * 9, 0, reason)

    def result(self, *, complete: bool) -> Transients:
        judged = [each for each in self.found if each.kind == "parameter" and each.changeover == self.judged]
        missing = next((f"{each.change}: {each.reason}" for each in judged if each.reason), "" if judged else NO_PARAMETER)
        worst = max(judged, key=_click, default=None)
        given = [each for each in judged if not each.reason]
        good = bool(given) and not missing
        return Transients(
            changeover=self.judged, change=worst.change if worst is not None else "",
            signal=worst.signal if worst is not None else "",
            peak_dbfs=_largest([each.peak_dbfs for each in given]) if good else None,
            energy_dbfs_s=_largest([each.energy_dbfs_s for each in given]) if good else None,
            settling_ms=_longest([each.settling_ms for each in given]) if good else None,
            click_468_dbfs=_largest([each.click_468_dbfs for each in given]) if good else None,
            reason=missing, level_dbfs=signals.LEVEL_DBFS, within_noise_factor=WITHIN_NOISE,
            noise_is_predicted=isinstance(self.realization.format, Fixed), changes=tuple(self.found), complete=complete,
            traces=tuple(trace for _, trace in self.worst.values()),
        )


def _click(one: Transient) -> float:
    return -inf if one.click_468_dbfs is None else one.click_468_dbfs


def _largest(figures: Sequence[float | None]) -> float:
    return max(each for each in figures if each is not None)


def _longest(times: Sequence[float | None]) -> float | None:
    return None if None in times else max(each for each in times if each is not None)


def _noise_rms(realization: Realization, x: FloatArray) -> float | None:
    """Of the rounding noise, 0 to half the rate: predicted; in floating point measured on a part of x. None if infinite."""
    if isinstance(realization.format, Fixed):
        level = max(predicted_full_noise(realization.program, output=output, channel=channel)
                    for output in range(len(realization.outputs)) for channel in range(realization.program.diagram.channels))
        return 10.0 ** (level / 20.0) / 2.0**0.5 if isfinite(level) or level < 0.0 else None
    columns = realization.diagram.channels
    half = len(x) // 2
    part = np.repeat(x[half : half + int(realization.rate), :1], columns, axis=1)
    difference = Run(realization, columns).step(part).difference
    power = float(np.mean(np.square(difference), axis=0).max())
    return power**0.5 if isfinite(power) else None
