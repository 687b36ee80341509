"""How long states hold subnormal numbers after a signal has ended, and what that costs."""

from collections.abc import Callable
from math import log

import numpy as np
from numpy.typing import NDArray

from streamhost.diagram.fan import from_input
from streamhost.measure.floats.playing import BLOCK, PEAK_DBFS, SEED, SIGNAL_S, Moment, Player, timed
from streamhost.measure.floats.result import Tail, TailState

FloatArray = NDArray[np.float64]
Report = Callable[[float, str], None]

MOST_S, MOST_QUICK_S = 60.0, 10.0
LONGEST_PERIOD = 2048
MARGIN = 1.25

class TailWatch:
    """Counts frames with subnormal states, block after block from the end of the signal."""

    def __init__(self, player: Player) -> None:
        self._player = player
        types = player.program.types
        self._least = np.array([float(np.finfo(types[index]).smallest_subnormal) for index in player.delays])
        self._tiny = np.array([float(np.finfo(types[index]).tiny) for index in player.delays])
        self._first = np.full(len(player.delays), -1)
        self._count = np.zeros(len(player.delays), np.int64)
        self._last = np.zeros(len(player.delays))
        self.first: int | None = None
        self.count = self.frames = 0
        self.ended: int | None = None
        self.moment: Moment | None = None
        self._most = 0

    def step(self) -> None:
        """One block of silence more. Of the block with the most subnormal frames the state before it is kept."""
        before = self._player.moment()
        states = self._player.play(np.zeros(BLOCK))[:, :, list(self._player.delays)]
        size = np.abs(states)
        subnormal = np.asarray(((size > 0.0) & (size < self._tiny)).any(axis=1))
        anywhere = np.asarray(subnormal.any(axis=1))
        found = subnormal.any(axis=0) & (self._first < 0)
        self._first[found] = self.frames + subnormal.argmax(axis=0)[found]
        self._count += subnormal.sum(axis=0)
        self._last = states[-1, 0]
        if anywhere.any() and self.first is None:
            self.first = self.frames + int(anywhere.argmax())
        self.count += int(anywhere.sum())
        if int(anywhere.sum()) > self._most:
            self._most, self.moment = int(anywhere.sum()), before
        alive = np.flatnonzero(states.any(axis=(1, 2)))
        if self._player.silent and self.ended is None:
            self.ended = self.frames + (int(alive[-1]) + 1 if len(alive) else 0)
        self.frames += BLOCK

    @property
    def enough_to_time(self) -> bool:
        return self._most > BLOCK // 2

    def states(self) -> tuple[TailState, ...]:
        nodes = self._player.program.nodes
        found = zip(self._player.delays, self._first, self._count, self._last / self._least, strict=True)
        return tuple(TailState(nodes[index].label, int(first) if first >= 0 else None, int(count), float(last))
                     for index, first, count, last in found)


def tail_of(player: Player, x: FloatArray, quick: bool, report: Report) -> Tail:
    """Of a player at the end of a noise, (frames,), that it has played; a whole block of it and of the tail is timed."""
    busy, rate = player.moment(), player.realization.rate
    watch = TailWatch(player)
    most = min(_frames_expected(player), (MOST_QUICK_S if quick else MOST_S) * rate)
    while watch.ended is None and watch.frames < most:
        report(watch.frames / most, f"{watch.frames / rate:.1f} s after the signal")
        watch.step()
    period = player.repeats(LONGEST_PERIOD) if watch.ended is None and watch.count else None
    times: tuple[float | None, float | None] = (None, None)
    if watch.moment is not None and watch.enough_to_time:
        times = (timed(player.realization, np.zeros(BLOCK), watch.moment), timed(player.realization, x[:BLOCK], busy))
    return Tail(
        signal_s=SIGNAL_S,
        signal_peak_dbfs=PEAK_DBFS,
        seed=SEED,
        first_frame=watch.first,
        subnormal_frames=watch.count,
        watched_frames=watch.frames,
        ended_frame=watch.ended,
        for_ever=True if period is not None else None if watch.ended is None else False,
        period_frames=period,
        states=watch.states(),
        tail_ns_per_frame=times[0],
        normal_ns_per_frame=times[1],
    )


def _frames_expected(player: Player) -> float:
    """Until the slowest pole has brought full scale below the smallest subnormal, a quarter more, and the delays' length."""
    diagram = player.program.diagram
    radius = max(float(np.abs(from_input(diagram, channel).poles).max(initial=0.0)) for channel in range(diagram.channels))
    least = min((float(np.finfo(kind).smallest_subnormal) for kind in player.program.types), default=1.0)
    if not 0.0 < radius < 1.0:
        return float("inf") if radius else player.program.state_words + BLOCK
    return MARGIN * log(least) / log(radius) + player.program.state_words + BLOCK
