"""Fixed-point formats: the eight places at which a program quantizes, with their defaults.

The short keys `rounding`, `overflow` and `dither` set signal, state and output (operand follows signal); a place's
own rounding or overflow beats them. Input stays half-even and saturating, accumulator and product undithered.
"""

from collections.abc import Mapping
from dataclasses import dataclass, replace

from streamhost.formats.resolving import resolved
from streamhost.formats.rules import AccumulatorRule, CoefficientRule, ProductRule
from streamhost.formats.words import Quantizer, Word

Place = str | Mapping[str, object]


@dataclass(frozen=True, init=False)
class Fixed:
    """A fixed-point format, its eight places resolved.

    Arguments are the keys of a preset's [format]: `signal` is a word such as "Q1.15"; a place is a word or a table
    {word, rounding, overflow, dither}; `coefficients` also takes {bits, point, rounding}; `accumulator` is "full", a
    number of bits, {bits, drop, overflow} or a word; `product` a number of fraction bits or {bits, rounding}.
    `arithmetic` names a shipped arithmetic that the other keys override.

    Raises FormatError; its `problems` lists every (key, message).
    """

    input: Quantizer
    coefficients: CoefficientRule
    operand: Quantizer
    product: ProductRule
    accumulator: AccumulatorRule
    signal: Quantizer
    state: Quantizer
    output: Quantizer
    feedback: str
    pre_sum: str
    dither_seed: int
    arithmetic: str | None
    coefficients_stated: bool

    def __init__(
        self,
        signal: Place | None = None,
        *,
        arithmetic: str | None = None,
        input: Place | None = None,
        coefficients: Place | None = None,
        operand: Place | None = None,
        product: int | str | Mapping[str, object] | None = None,
        accumulator: int | str | Mapping[str, object] | None = None,
        state: Place | None = None,
        output: Place | None = None,
        rounding: str = "half-up",
        rounding_place: str = "sum",
        overflow: str = "saturate",
        feedback: str = "subtracted",
        pre_sum: str = "exact",
        dither: str | None = None,
        dither_seed: int = 0,
        allow_vanishing: bool = False,
        allow_clamping: bool = False,
    ) -> None:
        stated = {key: value for key, value in locals().items() if key != "self"}
        for name, value in resolved(stated).items():
            object.__setattr__(self, name, value)

    def with_coefficient_word(self, word: Word) -> "Fixed":
        """The same format with coefficients in a word that is given."""
        changed = object.__new__(Fixed)
        for name, value in vars(self).items():
            object.__setattr__(changed, name, value)
        rule = replace(self.coefficients, word=word, bits=word.bits)
        object.__setattr__(changed, "coefficients", rule)
        return changed

    @property
    def label(self) -> str:
        """A short name for tables: the arithmetic's, or the signal word and what differs from it."""
        if self.arithmetic:
            return self.arithmetic
        wide = f" state {self.state.word}" if self.state.word != self.signal.word else ""
        return f"{self.signal.word}{wide}"
