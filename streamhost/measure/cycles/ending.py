"""What a realization is left with when a signal ends."""

from collections.abc import Callable, Iterator, Sequence

import numpy as np
from numpy.typing import NDArray

from streamhost.measure.cycles.results import Ended
from streamhost.measure.cycles.whole import CODES, Whole
from streamhost.measure.levels import peak_dbfs
from streamhost.program.ideal import quantized_input
from streamhost.program.native.kernel import compile_kernel, no_trace
from streamhost.realization import Realization

FloatArray = NDArray[np.float64]
Named = tuple[str, FloatArray]

SECONDS, SECONDS_QUICK = 1.0, 0.25
TONE_HZ = 997.0
TONES_DBFS = (-1.0, -20.0, -60.0)
NOISES_DBFS = (-20.0, -60.0)
RECORDING = "plucked"
STEPS_EACH = 1 << 23
"""Frames for which one state is followed at most, when the signal is over."""


def default_signals(rate: float, seed: int, quick: bool) -> Iterator[Named]:
    """(name, (frames,)): seeded noise and a tone at several levels, and the beginning of a shipped recording."""
    from streamhost.files import read_all
    from streamhost.shipped import resolve
    from streamhost.signals import sine, white

    frames = max(64, round((SECONDS_QUICK if quick else SECONDS) * rate))
    for level in NOISES_DBFS:
        yield f"white noise, seed {seed}, {level:g} dBFS", white(frames, 1, seed, level)[:, 0]
    for level in TONES_DBFS:
        frequency = min(TONE_HZ, rate / 5.0)
        yield f"{frequency:g} Hz, {level:g} dBFS", sine(frames, rate, frequency, level)[:, 0]
    yield f"{RECORDING}, its first {frames} samples", read_all(resolve(RECORDING, "sample"))[0][:frames, 0]


def after_signals(whole: Whole, signals: Sequence[Named], report: Callable[[float], None]) -> tuple[Ended, ...]:
    """Each signal from zero state, then silence until the state comes back."""
    states = []
    for done, (_, samples) in enumerate(signals):
        report(done / (2 * len(signals)))
        states.append(_state_after(whole, samples))
    lanes = np.stack(states, axis=1)
    landed = whole.land(lanes, None, STEPS_EACH * len(signals), lambda share: report(0.5 + share / 2))
    found = []
    for lane, (name, samples) in enumerate(signals):
        cycle = whole.cycle(f"after {name}", landed, lane)
        known = landed.found.period[lane] > 0
        reason = "" if known else f"not periodic within {STEPS_EACH} frames"
        found.append(Ended(name, peak_dbfs(float(np.abs(samples).max(initial=0.0))), channel_number(whole),
                           int(landed.frames[lane]), cycle, reason))
    return tuple(found)


def channel_number(whole: Whole) -> int | None:
    return whole.channel + 1 if whole.program.diagram.channels > 1 else None


def _state_after(whole: Whole, samples: FloatArray) -> NDArray[np.int64]:
    """The codes of the whole's states behind a signal (frames,) that all channels hear."""
    program, channels = whole.program, whole.program.diagram.channels
    codes = input_codes(whole.realization, samples)
    x = np.repeat(codes[:, None], channels, axis=1)
    memory = whole.realization.memory(channels)
    y = np.zeros((len(x), len(program.diagram.outputs) * channels), np.int64)
    compile_kernel(program, CODES).call(memory, x, y, marks=np.zeros(x.shape, np.uint8), trace=no_trace())
    return np.asarray(memory.state[whole.part.rows(program, memory.frame), whole.channel], dtype=np.int64)


def input_codes(realization: Realization, samples: FloatArray) -> NDArray[np.int64]:
    """What the input makes of samples; its word is cut to 53 bits, which is all that samples have."""
    word = realization.format.input.word  # type: ignore[union-attr]
    return np.asarray(np.rint(quantized_input(realization.program, samples) * 2.0**word.fraction), dtype=np.int64)
