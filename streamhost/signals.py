"""Test signals, the same on every machine.

Every value is a 24-bit code k / 2**23 in float64, shape (frames, channels), 1.0 = full scale; only `turning` and
`triangular`, of which measurements make finer ones, are not. Nothing here asks the machine's mathematical library:
phases and noise are 64-bit integers, levels and ratios come from decimal arithmetic, and the sine is a polynomial of
single operations, each of which is rounded alike everywhere.

Levels are peaks: a sine of `peak_dbfs` = 0 is a full-scale sine and reads 0 dBFS.
"""

from decimal import Decimal, localcontext
from fractions import Fraction
from math import factorial, isfinite

import numpy as np
import numpy.typing as npt

from streamhost.errors import RequestError

FULL_SCALE = 2**23
"""Codes below full scale; the largest code is one less."""

Signal = npt.NDArray[np.float64]

_TURN = 2**64  # phases are fractions of a turn in 64 bits: they wrap by themselves
_TWO_PI = 6.283185307179586
SINE_TERMS = [(-1) ** k / factorial(2 * k + 1) for k in range(9)]
COSINE_TERMS = [(-1) ** k / factorial(2 * k) for k in range(10)]


def silence(frames: int, channels: int = 1) -> Signal:
    """Zeros. RequestError for a length or a number of channels that cannot be, as everywhere here."""
    _check_shape(frames, channels)
    return np.zeros((frames, channels))


def dc(frames: int, level: float, channels: int = 1) -> Signal:
    """A constant, `level` from -1 to 1 of full scale, rounded to 24 bits."""
    _check_shape(frames, channels)
    if not -1.0 <= level <= 1.0:
        raise RequestError(f"level = {level}: a constant is from -1 to 1 of full scale.")
    code = min(round(level * FULL_SCALE), FULL_SCALE - 1)
    return np.full((frames, channels), code / FULL_SCALE)


def impulse(frames: int, peak_dbfs: float = 0.0, at: int = 0, channels: int = 1) -> Signal:
    """One sample of `peak_dbfs` at frame `at`, zeros elsewhere."""
    _check_shape(frames, channels)
    if frames == 0:
        raise RequestError("frames = 0: an impulse needs 1 frame or more.")
    if not 0 <= at < frames:
        raise RequestError(f"at = {at}: the impulse is at a frame from 0 to {frames - 1}, in a signal of {frames}.")
    samples = np.zeros((frames, channels))
    samples[at] = peak_code(peak_dbfs) / FULL_SCALE
    return samples


def white(frames: int, channels: int, seed: int, peak_dbfs: float) -> Signal:
    """Uniform white noise between -peak and +peak, independent between channels.

    A channel's samples depend on `seed` and its number alone: a longer signal begins like a shorter one. The generator
    is counter-based: G. L. Steele, D. Lea, C. H. Flood, "Fast splittable pseudorandom number generators", OOPSLA 2014.
    """
    _check_shape(frames, channels)
    if not 0 <= seed < 2**64:
        raise RequestError(f"seed = {seed}: a seed is a whole number from 0 to 2**64 - 1.")
    peak = peak_code(peak_dbfs)
    starts = random_words(seed, channels)
    codes = np.empty((frames, channels), dtype=np.int64)
    for channel, start in enumerate(starts):
        high = random_words(int(start), frames) >> np.uint64(24)  # 40 bits, times at most 24 bits
        codes[:, channel] = (high * np.uint64(2 * peak + 1) >> np.uint64(40)).astype(np.int64) - peak
    return codes / float(FULL_SCALE)


def sine(frames: int, rate: float, frequency: float, peak_dbfs: float, channels: int = 1) -> Signal:
    """A sine that begins at phase 0, `frequency` in Hz between 0 and rate/2, rounded to 24 bits without dither."""
    _check_shape(frames, channels)
    step = phase_step(rate, "frequency", frequency)
    phase = np.arange(frames, dtype=np.uint64) * np.uint64(step)
    return _from_phase(phase, peak_dbfs, channels)


def sweep(frames: int, rate: float, frequencies: tuple[float, float], peak_dbfs: float, channels: int = 1) -> Signal:
    """A logarithmic sweep: a sine whose frequency goes from the first to the second by equal ratios per frame."""
    _check_shape(frames, channels)
    first, last = (phase_step(rate, "frequencies", frequency) for frequency in frequencies)
    with localcontext() as context:
        context.prec = 40
        span = max(frames - 1, 1)
        ratio = float((Decimal(last) / Decimal(first)) ** (Decimal(1) / span))
    steps = np.full(frames, ratio)
    steps[:1] = first
    steps = np.multiply.accumulate(steps)
    phase = np.zeros(frames, dtype=np.uint64)
    phase[1:] = np.add.accumulate(steps[:-1].astype(np.uint64))
    return _from_phase(phase, peak_dbfs, channels)


def turning(frames: int, periods: int, window: int) -> Signal:
    """sin(2 pi (periods n + 1/8) / window) from n = 0 on, (frames,), to within 3e-16: the same in every window, to the bit.

    The eighth keeps samples from lying symmetric about a zero or a peak. `window` is below 2**31.
    """
    place = np.arange(frames, dtype=np.uint64) % np.uint64(window) * np.uint64(periods) % np.uint64(window)
    whole, rest = divmod(_TURN, window)
    phase = place * np.uint64(whole) + place * np.uint64(rest) // np.uint64(window)
    return _sine(phase + np.uint64(_TURN // (8 * window)))


def triangular(frames: int, seed: int) -> Signal:
    """Values between -1 and 1 of triangular density, independent, (frames,): a dither of two steps from peak to peak."""
    first, second = (random_words(int(start), frames) >> np.uint64(11) for start in random_words(seed, 2))
    return (first.astype(np.float64) - second.astype(np.float64)) / 2.0**53


def level(dbfs: float) -> float:
    """10^(dbfs / 20), rounded once."""
    with localcontext() as context:
        context.prec = 40
        return float(Decimal(10) ** (Decimal(dbfs) / 20))


def peak_code(peak_dbfs: float) -> int:
    """The 24-bit code of a peak, 0 to 2**23 - 1: the largest for 0 dBFS. RequestError above 0 dBFS."""
    if not isfinite(peak_dbfs) or peak_dbfs > 0:
        raise RequestError(f"peak_dbfs = {peak_dbfs}: a peak is at most 0 dBFS.")
    with localcontext() as context:
        context.prec = 40
        code = round(FULL_SCALE * Decimal(10) ** (Decimal(peak_dbfs) / 20))
    return min(code, FULL_SCALE - 1)


def random_words(seed: int, count: int) -> npt.NDArray[np.uint64]:
    """The first `count` 64-bit words of the generator behind `white`."""
    words = np.arange(1, count + 1, dtype=np.uint64) * np.uint64(0x9E3779B97F4A7C15) + np.uint64(seed)
    words = (words ^ (words >> np.uint64(30))) * np.uint64(0xBF58476D1CE4E5B9)
    words = (words ^ (words >> np.uint64(27))) * np.uint64(0x94D049BB133111EB)
    return words ^ (words >> np.uint64(31))


def _check_shape(frames: int, channels: int) -> None:
    if frames < 0:
        raise RequestError(f"frames = {frames}: a signal has 0 frames or more.")
    if channels < 1:
        raise RequestError(f"channels = {channels}: a signal has 1 channel or more.")


def phase_step(rate: float, name: str, frequency: float) -> int:
    """The turn per frame, in units of 2**-64 turns."""
    if not (isfinite(rate) and rate > 0):
        raise RequestError(f"rate = {rate}: a sample rate is above 0 Hz.")
    if not 0 < frequency < rate / 2:
        raise RequestError(f"{name} = {frequency}: allowed is above 0 and below half the sample rate, {rate / 2} Hz.")
    return round(Fraction(frequency) / Fraction(rate) * _TURN)


def _from_phase(phase: npt.NDArray[np.uint64], peak_dbfs: float, channels: int) -> Signal:
    codes = np.rint(_sine(phase) * peak_code(peak_dbfs)) + 0.0  # no negative zeros
    return np.repeat((codes / FULL_SCALE)[:, np.newaxis], channels, axis=1)


def _sine(phase: npt.NDArray[np.uint64]) -> Signal:
    """sin(2 pi phase / 2**64), to within 3e-16, by the power series on an eighth of a turn to either side of 0."""
    quarter = (phase + np.uint64(2**61)) >> np.uint64(62)
    rest = (phase - (quarter << np.uint64(62))).view(np.int64)
    angle = rest * (_TWO_PI / _TURN)
    square = angle * angle
    sine_part = angle * _series(square, SINE_TERMS)
    cosine_part = _series(square, COSINE_TERMS)
    value = np.where(quarter % 2 == 0, sine_part, cosine_part)
    return np.where(quarter % 4 >= 2, -value, value)


def _series(square: Signal, terms: list[float]) -> Signal:
    total = np.zeros_like(square)
    for term in reversed(terms):
        total = total * square + term
    return total
