"""Reading what a user wrote at a place of a format; every mistake is collected, none is passed over."""

from collections.abc import Mapping, Sequence
from dataclasses import replace

from streamhost.errors import FormatError, nearest
from streamhost.formats.rules import POINTS, AccumulatorRule, CoefficientRule, ProductRule
from streamhost.formats.words import MAX_WORD_BITS, OVERFLOWS, ROUNDINGS, Quantizer, Word, parse_word

MOST_SEED = 2**64 - 1


class Collector:
    """Gathers (key, message) pairs, so that all mistakes of a format are told at once."""

    def __init__(self) -> None:
        self.problems: list[tuple[str, str]] = []

    def add(self, key: str, message: str) -> None:
        self.problems.append((key, message))

    def choice(self, key: str, value: object, allowed: Sequence[str]) -> bool:
        if value in allowed:
            return True
        self.add(key, f"= {value!r} is not known: {', '.join(allowed)}.{nearest(str(value), allowed)}")
        return False

    def whole(self, key: str, value: object, low: int, high: int) -> bool:
        if isinstance(value, int) and not isinstance(value, bool) and low <= value <= high:
            return True
        self.add(key, f"= {value!r} is not a whole number from {low} to {high}.")
        return False

    def dither(self, key: str, value: object) -> None:
        if value not in (None, "tpdf"):
            self.add(key, f'= {value!r} is not known: "tpdf", or left out.')

    def seed(self, key: str, value: object) -> None:
        self.whole(key, value, 0, MOST_SEED)

    def flag(self, key: str, value: object) -> None:
        if not isinstance(value, bool):
            self.add(key, f"= {value!r} is neither true nor false.")

    def word(self, key: str, value: object, *, least_integer: int = 1) -> Word | None:
        try:
            return parse_word(value, key, least_integer=least_integer)
        except FormatError as error:
            self.add(key, str(error).removeprefix(f"{key} "))
            return None

    def keys(self, key: str, table: Mapping[str, object], allowed: Sequence[str]) -> None:
        for name in table:
            if name not in allowed:
                self.add(key, f"has no key {name!r}: {', '.join(allowed)}.{nearest(str(name), allowed)}")

    def text(self) -> str:
        return " ".join(f"{key} {message}" for key, message in self.problems)

    def raise_any(self) -> None:
        if self.problems:
            raise FormatError(self.text(), self.problems)


def parse_place(collect: Collector, key: str, given: object, default: Quantizer, *, dither: bool = True) -> Quantizer:
    """A quantizer from a word or a table; what is not said comes from `default`."""
    if given is None:
        return default
    if not isinstance(given, Mapping):
        word = collect.word(key, given)
        return replace(default, word=word) if word else default
    collect.keys(key, given, ("word", "rounding", "overflow", "dither"))
    quantizer = default
    if "word" in given and (word := collect.word(key, given["word"])):
        quantizer = replace(quantizer, word=word)
    if "rounding" in given and collect.choice(f"{key}.rounding", given["rounding"], ROUNDINGS):
        quantizer = replace(quantizer, rounding=str(given["rounding"]))
    if "overflow" in given and collect.choice(f"{key}.overflow", given["overflow"], OVERFLOWS):
        quantizer = replace(quantizer, overflow=str(given["overflow"]))
    if "dither" in given:
        collect.dither(f"{key}.dither", given["dither"])
        if not dither:
            collect.add(f"{key}.dither", "is not offered: what comes in is not dithered.")
        quantizer = replace(quantizer, dither=given["dither"] == "tpdf")
    return quantizer


def parse_coefficients(
    collect: Collector, given: object, bits: int, vanishing: bool, clamping: bool
) -> CoefficientRule:
    rule = CoefficientRule(bits, allow_vanishing=vanishing, allow_clamping=clamping)
    if given is None:
        return rule
    key = "coefficients"
    table: Mapping[str, object] = given if isinstance(given, Mapping) else {"word": given}
    collect.keys(key, table, ("word", "bits", "point", "rounding"))
    if "word" in table:
        word = collect.word(key, table["word"], least_integer=-999)
        rule = replace(rule, word=word, bits=word.bits) if word else rule
        if "bits" in table or "point" in table:
            collect.add(key, "states a word, which fixes both bits and point: leave those two out, or the word.")
    elif "bits" in table and collect.whole(f"{key}.bits", table["bits"], 2, MAX_WORD_BITS):
        rule = replace(rule, bits=int(str(table["bits"])))
    if "point" in table and collect.choice(f"{key}.point", table["point"], POINTS):
        rule = replace(rule, point=str(table["point"]))
    if "rounding" in table and collect.choice(f"{key}.rounding", table["rounding"], ROUNDINGS):
        rule = replace(rule, rounding=str(table["rounding"]))
    return rule


def parse_product(collect: Collector, given: object) -> ProductRule:
    if given is None:
        return ProductRule()
    table: Mapping[str, object] = given if isinstance(given, Mapping) else {"bits": given}
    collect.keys("product", table, ("bits", "rounding"))
    rule = ProductRule()
    bits = table.get("bits", "exact")
    if bits != "exact" and collect.whole("product", bits, 0, 2 * MAX_WORD_BITS):
        rule = replace(rule, fraction=int(str(bits)))
    if "rounding" in table and collect.choice("product.rounding", table["rounding"], ROUNDINGS):
        rule = replace(rule, rounding=str(table["rounding"]))
    return rule


def parse_accumulator(collect: Collector, given: object) -> AccumulatorRule:
    if given is None:
        return AccumulatorRule()
    key = "accumulator"
    table: Mapping[str, object]
    if isinstance(given, Mapping):
        table = given
    else:
        table = {"word": given} if isinstance(given, str) else {"bits": given}
    collect.keys(key, table, ("word", "bits", "drop", "overflow"))
    rule = AccumulatorRule()
    if "overflow" in table and collect.choice(f"{key}.overflow", table["overflow"], OVERFLOWS):
        rule = replace(rule, overflow=str(table["overflow"]))
    if "bits" in table:
        if collect.whole(key, table["bits"], 8, MAX_WORD_BITS):
            rule = replace(rule, bits=int(str(table["bits"])))
        if "drop" in table and collect.whole(f"{key}.drop", table["drop"], -MAX_WORD_BITS, 2 * MAX_WORD_BITS):
            rule = replace(rule, drop=int(str(table["drop"])))
    elif "drop" in table:
        collect.add(f"{key}.drop", "goes with bits: { bits = 32, drop = 16 }.")
    if "word" in table and table["word"] != "full":
        if "bits" in table:
            collect.add(key, "states both a word and bits: leave one out.")
        rule = replace(rule, word=collect.word(key, table["word"]))
    return rule
