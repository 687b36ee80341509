"""The ideal of a program: the same diagram with the coefficients as stored, its own rounding far below what it judges."""

from dataclasses import dataclass

import numpy as np

from streamhost.diagram.norms import powers_from_input
from streamhost.formats import Fixed, Float
from streamhost.program.float_errors import float_spectrum
from streamhost.program.floating import lower_float
from streamhost.program.program import Program
from streamhost.program.sources import FloatArray, noise_spectrum

MARGIN_DB = 20.0


@dataclass(frozen=True)
class Ideal:
    """A float64 program, and whether it is to be run in double-double."""

    program: Program
    double: bool

    @property
    def label(self) -> str:
        return "double-double" if self.double else "float64"


def ideal_of(program: Program) -> Ideal:
    """The ideal to judge a program by: in float64 where that lies 20 dB below what is judged, else in double-double.

    That is asked at every output of every channel where something is rounded.
    The rounding of both is estimated for a white signal at full scale; where either cannot be (a pole on or outside the
    circle), a fixed word of up to 32 bits is judged by float64 and anything finer by double-double.
    """
    plain = ideal_program(program)
    grid = np.linspace(0.0, np.pi, 4097)
    if isinstance(program.format, Float):
        return Ideal(plain, program.format.type == "float64")
    places = [(channel, output) for channel in range(program.diagram.channels)
              for output in range(len(program.diagram.outputs))]
    own = np.array([_noise_at_full_scale(plain, grid, *place) for place in places])
    judged = np.array([float(np.mean(noise_spectrum(program, grid, *place))) for place in places])
    if not (np.isfinite(own).all() and np.isfinite(judged).all()):
        widest = max(quantizer.word.bits for quantizer in program.quantizers)
        return Ideal(plain, widest > 32)
    noisy = (judged > 0.0) if judged.any() else np.ones(len(places), np.bool_)
    return Ideal(plain, bool((own > judged * 10 ** (-MARGIN_DB / 10))[noisy].any()))


def _noise_at_full_scale(program: Program, grid: FloatArray, channel: int, output: int) -> float:
    """Estimated noise power of a floating-point program at an output for white noise at full scale."""
    rms = np.sqrt(powers_from_input(program.diagram, channel))
    return float(np.mean(float_spectrum(program, rms, grid, channel, output)))


def ideal_program(program: Program) -> Program:
    """The diagram of a program with its stored coefficients in float64, roundings left out. Its input is the quantized one."""
    return lower_float(program.diagram, Float("float64"))


def quantized_input(program: Program, x: FloatArray) -> FloatArray:
    """What a program makes of its input: the values of its codes, or the samples rounded to its type."""
    if isinstance(program.format, Float):
        return np.where(np.isnan(x), 0.0, x).astype(program.format.type).astype(np.float64)
    assert isinstance(program.format, Fixed), "a format is fixed or floating"
    quantizer = program.format.input
    scale, saturates = 2.0**quantizer.word.fraction, quantizer.overflow == "saturate"
    low, high = float(quantizer.word.low), float(quantizer.word.high)
    scaled = np.nan_to_num(x * scale, posinf=high if saturates else 0.0, neginf=low if saturates else 0.0)
    codes = _rounded(scaled, quantizer.rounding)
    if saturates:
        return np.clip(codes, low, high) / scale
    span = high - low + 1
    return (codes - np.floor((codes - low) / span) * span) / scale


def _rounded(scaled: FloatArray, rounding: str) -> FloatArray:
    """Whole numbers by a named rounding; exact below 2^53."""
    if rounding == "half-even":
        return np.rint(scaled)
    if rounding == "toward-zero":
        return np.trunc(scaled)
    floor: FloatArray = np.floor(scaled)
    rest = scaled - floor
    if rounding == "floor":
        return floor
    up = rest >= 0.5 if rounding == "half-up" else np.where(scaled >= 0, rest >= 0.5, rest > 0.5)
    return floor + up
