"""What the lanes run on: the device, an audio file round and round, or a generated signal."""

from dataclasses import dataclass, field
from decimal import Decimal, localcontext

import numpy as np
from numpy.typing import NDArray

from streamhost.errors import RequestError, nearest
from streamhost.host.records import SOURCE
from streamhost.host.source_kinds import KINDS, NUMBERS
from streamhost.signals import FULL_SCALE, peak_code, phase_step, random_words

LEVEL_DBFS = -20.0
SWEEP_S = 10.0
PINK_SECTIONS = 10
PINK_LOWEST = Decimal(10)
PINK_CREST_DB = 13.0
"""The rms of pink noise lies so far under its stated peak, at which it is clipped: 4.5 standard deviations."""


@dataclass(frozen=True, eq=False)
class Source:
    """A SOURCE record and what it points to; the record holds how far it is, so a source serves one host."""

    said: str
    record: NDArray[np.void]
    arrays: tuple[NDArray[np.generic], ...] = field(default=(), repr=False)

    @property
    def kind(self) -> str:
        return KINDS[int(self.record["kind"][0])]

    @property
    def address(self) -> int:
        return int(self.record.ctypes.data)


def device() -> Source:
    """What comes in from the card, or from whoever drives the host; silence where nothing does."""
    return _source("device", "device", 1)


def looped(samples: NDArray[np.float64], said: str) -> Source:
    """Samples (frames, channels) over and over, from the first. RequestError where there is none."""
    if samples.ndim != 2 or not samples.size:
        raise RequestError(f"{said}: a loop has at least one frame of (frames, channels), not the shape {samples.shape}.")
    data = np.ascontiguousarray(samples, np.float64)
    return _source("loop", f"{said}, looped", data.shape[1], data, length=len(data))


def generated(text: str, rate: float, channels: int, seed: int = 1) -> Source:
    """A signal as the command line states it: KIND[:VALUES][@DBFS], the level a peak.

    silence; tone:1000; tones:60,7000 (each half the peak); sweep:20,20000,10 (Hz, Hz, s, over and over); white; pink;
    impulses:1 (seconds apart); dc:0.5 (of full scale). Raises RequestError for what is none of these.
    """
    body, at, level = text.partition("@")
    kind, _, rest = body.partition(":")
    try:
        values = [float(value) for value in rest.split(",")] if rest else []
        peak_dbfs = float(level) if at else LEVEL_DBFS
    except ValueError:
        raise RequestError(f'source "{text}": {SPELLING}') from None
    made = _MAKERS.get(kind)
    if made is None:
        raise RequestError(f'source "{text}": {SPELLING}{nearest(kind, _MAKERS)}')
    least, most = _VALUES[kind]
    if not least <= len(values) <= most:
        count = str(least) if least == most else f"{least} to {most}"
        raise RequestError(f'source "{text}": {kind} takes {count} values. {SPELLING}')
    return made(_Asked(text, rate, channels, seed, values, peak_code(peak_dbfs)))


@dataclass(frozen=True)
class _Asked:
    text: str
    rate: float
    channels: int
    seed: int
    values: list[float]
    peak: int


def _source(kind: str, said: str, channels: int, data: NDArray[np.generic] | None = None, **fields: float) -> Source:
    record = np.zeros(1, SOURCE)
    record["kind"], record["channels"] = NUMBERS[kind], channels
    for name, value in fields.items():
        record[name] = value
    if data is None:
        return Source(said, record)
    record["data"] = data.ctypes.data
    return Source(said, record, (data,))


def _wrapped(step: int) -> int:
    """A fraction of a turn in 64 bits, as a signed word."""
    return step - (1 << 64) if step >= 1 << 63 else step


def _silence(asked: _Asked) -> Source:
    return _source("silence", asked.text, asked.channels)


def _tone(asked: _Asked) -> Source:
    step = phase_step(asked.rate, "frequency", asked.values[0])
    return _source("sine", asked.text, asked.channels, peak=asked.peak, first=_wrapped(step))


def _tones(asked: _Asked) -> Source:
    first, second = (_wrapped(phase_step(asked.rate, "frequency", value)) for value in asked.values)
    return _source("tones", asked.text, asked.channels, peak=asked.peak // 2, first=first, second=second)


def _sweep(asked: _Asked) -> Source:
    seconds = asked.values[2] if len(asked.values) == 3 else SWEEP_S
    frames = round(seconds * asked.rate)
    if not 2 <= frames < 1 << 40:
        raise RequestError(f'source "{asked.text}": a sweep lasts at least two frames, not {seconds} s.')
    first, last = (phase_step(asked.rate, "frequencies", value) for value in asked.values[:2])
    with localcontext() as context:
        context.prec = 40
        ratio = float((Decimal(last) / Decimal(first)) ** (Decimal(1) / (frames - 1)))
    return _source("sweep", asked.text, asked.channels, peak=asked.peak, period=frames, first_step=float(first), ratio=ratio)


def _white(asked: _Asked) -> Source:
    starts = random_words(asked.seed, asked.channels).view(np.int64)
    return _source("white", asked.text, asked.channels, starts, peak=asked.peak)


def _pink(asked: _Asked) -> Source:
    sections = pink_sections(asked.rate)
    data = np.zeros(asked.channels + len(sections) * (2 + 2 * asked.channels))
    data[: asked.channels] = random_words(asked.seed, asked.channels).view(np.float64)
    for k, (zero, pole) in enumerate(sections):
        at = asked.channels + k * (2 + 2 * asked.channels)
        data[at], data[at + 1] = zero, pole
    rms = FULL_SCALE / 3.0**0.5 * pink_gain(sections)
    level = asked.peak * 10.0 ** (-PINK_CREST_DB / 20.0) / rms
    return _source("pink", asked.text, asked.channels, data, peak=asked.peak, first=FULL_SCALE - 1,
                   length=len(sections), level=float(f"{level:.12g}"))


def _impulses(asked: _Asked) -> Source:
    period = round((asked.values[0] if asked.values else 1.0) * asked.rate)
    if not 1 <= period < 1 << 40:
        raise RequestError(f'source "{asked.text}": impulses are at least one frame apart.')
    return _source("impulses", asked.text, asked.channels, peak=asked.peak, period=period)


def _dc(asked: _Asked) -> Source:
    level = asked.values[0]
    if not -1.0 <= level <= 1.0:
        raise RequestError(f'source "{asked.text}": a constant is from -1 to 1 of full scale.')
    return _source("dc", asked.text, asked.channels, peak=min(round(level * FULL_SCALE), FULL_SCALE - 1))


def pink_sections(rate: float) -> list[tuple[float, float]]:
    """(zero, pole) of the sections that make pink noise from white: -3 dB an octave from 20 Hz to 10 kHz, within 0.6 dB.

    Poles at equal ratios from 10 Hz to half the rate, a zero half a ratio above each, mapped by exp(-2 pi f / rate): a
    slope of half of what a pole gives, as the ladder of equal resistors and capacitors has it.
    """
    with localcontext() as context:
        context.prec = 40
        highest, turn = Decimal(rate) / 2, Decimal("6.283185307179586476925286766559") / Decimal(rate)
        ratio = (highest / PINK_LOWEST) ** (Decimal(1) / PINK_SECTIONS)
        places = [PINK_LOWEST * ratio**k for k in range(PINK_SECTIONS)]
        return [(float((-turn * place * ratio.sqrt()).exp()), float((-turn * place).exp())) for place in places]


def pink_gain(sections: list[tuple[float, float]], points: int = 1 << 16) -> float:
    """The rms that white noise of rms 1 has behind the sections."""
    z = np.exp(-1j * np.pi * (np.arange(points) + 0.5) / points)
    power = np.ones(points)
    for zero, pole in sections:
        power *= np.abs((1.0 - zero * z) / (1.0 - pole * z)) ** 2
    return float(np.sqrt(power.mean()))


_MAKERS = {"silence": _silence, "tone": _tone, "tones": _tones, "sweep": _sweep, "white": _white, "pink": _pink,
           "impulses": _impulses, "dc": _dc}
_VALUES = {"silence": (0, 0), "tone": (1, 1), "tones": (2, 2), "sweep": (2, 3), "white": (0, 0), "pink": (0, 0),
           "impulses": (0, 1), "dc": (1, 1)}
SPELLING = ("a source is KIND[:VALUES][@DBFS]: silence, tone:1000, tones:60,7000, sweep:20,20000,10, white, pink, impulses:1 "
            "or dc:0.5, each with a peak such as @-20.")

assert set(KINDS) >= {"device", "loop"}, "the step knows these"
