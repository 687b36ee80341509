"""The places of a format that are no plain quantizers: coefficients, product, accumulator."""

from dataclasses import dataclass

from streamhost.formats.words import Word

POINTS = ("section", "polynomial", "realization", "coefficient")


@dataclass(frozen=True)
class CoefficientRule:
    """How coefficients are stored: one fixed word, or so many bits with a point found for each group."""

    bits: int
    point: str = "section"
    word: Word | None = None
    rounding: str = "half-away"
    allow_vanishing: bool = False
    allow_clamping: bool = False


@dataclass(frozen=True)
class ProductRule:
    """Fraction bits that a product keeps as it enters the accumulator (None: all), and its rounding."""

    fraction: int | None = None
    rounding: str = "floor"


@dataclass(frozen=True)
class AccumulatorRule:
    """`full` (bits and word None), N bits (with `drop`), or a stated word; what happens when a sum leaves it."""

    bits: int | None = None
    drop: int = 0
    word: Word | None = None
    overflow: str = "wrap"

    @property
    def full(self) -> bool:
        return self.bits is None and self.word is None
