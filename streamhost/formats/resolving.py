"""From the keys of a fixed-point format, as stated, to its eight places with every default filled in."""

from collections.abc import Mapping

from streamhost.errors import FormatError
from streamhost.formats.arithmetics import ARITHMETICS
from streamhost.formats.parsing import (
    Collector,
    parse_accumulator,
    parse_coefficients,
    parse_place,
    parse_product,
)
from streamhost.formats.rules import ProductRule
from streamhost.formats.words import OVERFLOWS, ROUNDINGS, Quantizer, Word

PRE_SUMS = ("exact", "half", "signal")
FEEDBACKS = ("subtracted", "negated")
DEFAULT_SIGNAL = "Q1.15"
_NO_WORD = Word(1, 1)
_OF_ARITHMETICS = ("signal", "coefficients", "state", "operand", "accumulator")


def resolved(stated: Mapping[str, object]) -> dict[str, object]:
    """The places and choices of a format. Raises FormatError with every problem of a stage."""
    collect = Collector()
    keys = {**stated, **_under_arithmetic(collect, stated)}
    keys["signal"] = keys["signal"] or DEFAULT_SIGNAL
    _check_choices(collect, keys)
    collect.raise_any()
    rounding, overflow, dither = str(keys["rounding"]), str(keys["overflow"]), keys["dither"] is not None
    signal = parse_place(collect, "signal", keys["signal"], Quantizer(_NO_WORD, rounding, overflow, dither))
    collect.raise_any()
    follow = Quantizer(signal.word, rounding, overflow, dither)
    at_product = keys["rounding_place"] == "product"
    places: dict[str, object] = {
        "signal": signal,
        "input": parse_place(collect, "input", keys["input"], Quantizer(signal.word, "half-even"), dither=False),
        "operand": parse_place(collect, "operand", keys["operand"], signal),
        "state": parse_place(collect, "state", keys["state"], follow),
        "output": parse_place(collect, "output", keys["output"], follow),
        "coefficients": parse_coefficients(
            collect, keys["coefficients"], signal.word.bits, bool(keys["allow_vanishing"]), bool(keys["allow_clamping"])
        ),
        "product": ProductRule(signal.word.fraction, rounding)
        if at_product
        else parse_product(collect, keys["product"]),
        "accumulator": parse_accumulator(collect, keys["accumulator"]),
        "coefficients_stated": stated["coefficients"] is not None,
    }
    collect.raise_any()
    return places | {key: keys[key] for key in ("feedback", "pre_sum", "dither_seed", "arithmetic")}


def _under_arithmetic(collect: Collector, stated: Mapping[str, object]) -> dict[str, object]:
    """The keys of the arithmetic that is named, where they are not stated themselves."""
    name = stated["arithmetic"]
    if name is None:
        return {}
    if not isinstance(name, str) or name not in ARITHMETICS:
        collect.choice("arithmetic", name, tuple(ARITHMETICS))
        raise FormatError(collect.text(), collect.problems)
    return {key: ARITHMETICS[name].get(key) for key in _OF_ARITHMETICS if stated[key] is None}


def _check_choices(collect: Collector, keys: Mapping[str, object]) -> None:
    collect.choice("rounding", keys["rounding"], ROUNDINGS)
    collect.choice("overflow", keys["overflow"], OVERFLOWS)
    collect.choice("rounding_place", keys["rounding_place"], ("sum", "product"))
    collect.choice("feedback", keys["feedback"], FEEDBACKS)
    collect.choice("pre_sum", keys["pre_sum"], PRE_SUMS)
    collect.dither("dither", keys["dither"])
    collect.seed("dither_seed", keys["dither_seed"])
    collect.flag("allow_vanishing", keys["allow_vanishing"])
    collect.flag("allow_clamping", keys["allow_clamping"])
    if keys["rounding_place"] == "product" and keys["product"] is not None:
        collect.add("product", 'and rounding_place = "product" say two things about one rounding: state one of them.')
