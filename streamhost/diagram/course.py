"""How responses run: what is over after a first stretch, what dies out, what never does, and the energy of each."""

from dataclasses import dataclass, replace
from math import inf

import numpy as np

from streamhost.diagram.fan import MOST_DENSE, BoolArray, Fan, FloatArray, run

DOUBLINGS = 30
"""2^30 frames, six hours at 48 kHz: what still gains energy then is taken to do so for ever (poles within 1e-9)."""

STILL_GROWING = 1e-2
"""Growth of the energy in the last doubling that says so: a pole on the circle doubles it, a hidden one's rounding
errors add less than 1e-4."""

GONE = 1e-40
"""A power of A so small ends the doubling: nothing that can be told apart from 0 is left."""

LONGEST_RUN = 1 << 18
LARGEST_RUN = 1 << 25
"""Frames, and frames times exits, that a response with many states is run for."""

NEGLIGIBLE = 1e-24
EXPLODED = 1e30


@dataclass(frozen=True, eq=False)
class Course:
    """The responses of a fan, in order of its exits.

    fan: the stable part; head: the first frames, (frames, exits); rest: how they go on, from the frame after the
    head; ended: exits whose response is over, or, where `run_down`, below 1e-12 of itself; energy: sum of squares,
    infinite where the response does not die out.
    """

    fan: Fan
    head: FloatArray
    rest: Fan
    ended: BoolArray
    energy: FloatArray
    run_down: bool = False

    @property
    def lively(self) -> BoolArray:
        """Exits whose response goes on for ever and dies out."""
        return ~self.ended & np.isfinite(self.energy)


def follow(fan: Fan) -> Course:
    """Classify the responses of a fan and sum their energy.

    A response of S states that is 0 for S frames after the first S + 1 is over (Cayley and Hamilton). A loop whose
    poles lie outside the unit circle counts as seen by everything it drives, even where zeros cancel it exactly.
    With many states the response itself is run, and what lasts longer than that counts as never dying out.
    """
    stable, grows = fan.pruned().without_growth()
    stable = stable.pruned()
    states = len(stable.entry)
    with np.errstate(over="ignore", invalid="ignore"):
        head, state = run(stable, 2 * states + 2)
    silent: BoolArray = np.logical_not(head[states + 1:].any(axis=0))
    rest = Fan(stable.A, state, np.where(silent[:, None], 0.0, stable.exits), np.zeros_like(stable.direct)).pruned()
    ended = ~rest.exits.any(axis=1) & ~grows
    if len(rest.entry) > MOST_DENSE:
        return _run_down(stable, grows)
    energy = (head**2).sum(axis=0) + tail_energy(rest)
    energy[grows] = inf
    return Course(stable, head, rest, ended, energy)


def _run_down(fan: Fan, grows: BoolArray) -> Course:
    """The course from the response itself, run until its second half is negligible."""
    frames = 4 * len(fan.entry)
    most = max(frames, min(LONGEST_RUN, LARGEST_RUN // len(fan.direct)))
    while True:
        with np.errstate(over="ignore", invalid="ignore"):
            head, state = run(fan, frames)
            energy, late = (head**2).sum(axis=0), (head[frames // 2:] ** 2).sum(axis=0)
            over = late <= NEGLIGIBLE * energy
        if over.all() or frames >= most or not np.abs(state).max() < EXPLODED:
            break
        frames = min(2 * frames, most)
    ended = over & ~grows
    silent = Fan(fan.A, np.zeros_like(fan.entry), fan.exits, np.zeros_like(fan.direct)).pruned()
    return Course(fan, head, silent, ended, np.where(ended, energy, inf), run_down=True)


def tail_energy(fan: Fan) -> FloatArray:
    """The energy of sum over k of (exits A^k entry)^2, for each exit; infinite where it does not die out."""
    before, after = gramian_factors(fan.A, fan.entry)
    with np.errstate(over="ignore", invalid="ignore"):
        energy = ((fan.exits @ after) ** 2).sum(axis=1)
        earlier = ((fan.exits @ before) ** 2).sum(axis=1)
        dies = np.isfinite(energy) & (energy <= (1.0 + STILL_GROWING) * earlier)
    return np.where(dies, energy, inf)


def gramian_factors(A: FloatArray, entry: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Z with Z Z' = sum over k of A^k entry entry' A'^k, before the last doubling of the frames summed, and after it.

    Square-root doubling (Z becomes [Z, A^(2^j) Z], compressed by QR): squares are never subtracted, so that no
    energy can come out negative, however near to the circle the poles are.
    """
    before = after = entry[:, None]
    power = A
    with np.errstate(over="ignore", invalid="ignore"):
        for _ in range(DOUBLINGS):
            before, after = after, np.hstack((after, power @ after))
            if after.shape[1] > after.shape[0]:
                after = np.asarray(np.linalg.qr(after.T, mode="r")).T
            if not np.abs(power).max(initial=0.0) > GONE:
                break
            power = power @ power
    return before, after


def settling(course: Course, exit_: int, drop: float) -> float:
    """Frames until the energy that is left of one response is `drop` of its total; infinite where it never is."""
    total = course.energy[exit_]
    if not np.isfinite(total):
        return inf
    alone = np.arange(len(course.energy)) == exit_
    rest = course.rest.watched(alone)
    left = np.cumsum(course.head[::-1, exit_] ** 2)[::-1] + tail_energy(rest)[0]
    if (small := np.flatnonzero(left <= drop * total)).size:
        return float(small[0])
    return len(left) + _frames_until(rest, drop * total)


def _frames_until(fan: Fan, energy: float) -> int:
    """The first frame from which no more than `energy` is left, by powers of A from the largest down."""
    factor = gramian_factors(fan.A.T, fan.exits[0])[1]
    powers = [fan.A]
    while len(powers) < DOUBLINGS and np.abs(powers[-1]).max(initial=0.0) > GONE:
        powers.append(powers[-1] @ powers[-1])
    if _left(factor, fan.entry) <= energy:
        return 0
    state, frames = fan.entry, 0
    for j in reversed(range(len(powers))):
        later = powers[j] @ state
        if _left(factor, later) > energy:
            state, frames = later, frames + 2**j
    return frames + 1


def _left(factor: FloatArray, state: FloatArray) -> float:
    return float(((factor.T @ state) ** 2).sum())


def slowed(fan: Fan, factor: float) -> Fan:
    """The fan with every response divided by factor^k."""
    return replace(fan, A=fan.A / factor)
