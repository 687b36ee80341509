"""Fixed-point formats: the eight places at which a program quantizes, with their defaults.

The short keys `rounding`, `overflow` and `dither` set signal, state and output (operand follows signal); a place's
own rounding or overflow beats them. Input stays half-even and saturating, accumulator and product undithered.
"""

from collections.abc import Mapping
from dataclasses import dataclass, fields

from streamhost.errors import FormatError
from streamhost.formats.parsing import (
    Collector,
    parse_accumulator,
    parse_coefficients,
    parse_place,
    parse_product,
)
from streamhost.formats.rules import AccumulatorRule, CoefficientRule, ProductRule
from streamhost.formats.words import OVERFLOWS, ROUNDINGS, Quantizer, Word

Place = str | Mapping[str, object]
PRE_SUMS = ("exact", "half", "signal")
FEEDBACKS = ("subtracted", "negated")
_NO_WORD = Word(1, 1)


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
        collect = Collector()
        given = _under_arithmetic(collect, arithmetic, {
            "signal": signal, "coefficients": coefficients, "state": state, "operand": operand, "accumulator": accumulator,
        })
        collect.choice("rounding", rounding, ROUNDINGS)
        collect.choice("overflow", overflow, OVERFLOWS)
        collect.choice("rounding_place", rounding_place, ("sum", "product"))
        collect.choice("feedback", feedback, FEEDBACKS)
        collect.choice("pre_sum", pre_sum, PRE_SUMS)
        collect.dither("dither", dither)
        collect.seed("dither_seed", dither_seed)
        collect.flag("allow_vanishing", allow_vanishing)
        collect.flag("allow_clamping", allow_clamping)
        if given["signal"] is None:
            collect.add("signal", 'is missing: a fixed-point format states its signal word, for instance signal = "Q1.15".')
        if rounding_place == "product" and product is not None:
            collect.add("product", 'and rounding_place = "product" say two things about one rounding: state one of them.')
        collect.raise_any()
        short = Quantizer(word=_NO_WORD, rounding=rounding, overflow=overflow, dither=dither is not None)
        at_signal = parse_place(collect, "signal", given["signal"], short)
        collect.raise_any()
        follow = short.with_word(at_signal.word)
        places = {
            "signal": at_signal,
            "input": parse_place(collect, "input", input, Quantizer(at_signal.word, "half-even"), dither=False),
            "operand": parse_place(collect, "operand", given["operand"], at_signal),
            "state": parse_place(collect, "state", given["state"], follow),
            "output": parse_place(collect, "output", output, follow),
            "coefficients": parse_coefficients(collect, given["coefficients"], at_signal.word.bits,
                                               allow_vanishing, allow_clamping),
            "product": ProductRule(at_signal.word.fraction, rounding) if rounding_place == "product"
            else parse_product(collect, product),
            "accumulator": parse_accumulator(collect, given["accumulator"]),
        }
        collect.raise_any()
        places |= {"feedback": feedback, "pre_sum": pre_sum, "dither_seed": dither_seed, "arithmetic": arithmetic,
                   "coefficients_stated": coefficients is not None}
        for field in fields(self):
            object.__setattr__(self, field.name, places[field.name])

    @property
    def label(self) -> str:
        """A short name for tables: the arithmetic's, or the signal word and what differs from it."""
        if self.arithmetic:
            return self.arithmetic
        wide = f" state {self.state.word}" if self.state.word != self.signal.word else ""
        return f"{self.signal.word}{wide}"


def _under_arithmetic(collect: Collector, name: str | None, given: dict[str, object]) -> dict[str, object]:
    """The keys of a shipped arithmetic, overridden by what is given."""
    from streamhost.formats.arithmetics import ARITHMETICS

    if name is None:
        return given
    if name not in ARITHMETICS:
        collect.choice("arithmetic", name, tuple(ARITHMETICS))
        raise FormatError(collect.text(), collect.problems)
    return {key: ARITHMETICS[name].get(key) if value is None else value for key, value in given.items()}
