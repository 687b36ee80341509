"""Coefficients as stored: each rounded once, with one binary point a group."""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from fractions import Fraction
from math import frexp

import numpy as np

from streamhost.diagram.diagram import Diagram, FloatArray
from streamhost.diagram.nodes import Slot
from streamhost.errors import FormatError
from streamhost.formats import CoefficientRule, Fixed, Word
from streamhost.program.integers import rounded_value, saturated

Codes = tuple[tuple[int, ...], ...]


@dataclass(frozen=True)
class Stored:
    """Coefficients in fixed point: per slot a word and one code per channel; how many vanished or were clamped."""

    words: tuple[Word, ...]
    codes: Codes
    vanished: int = 0
    clamped: int = 0

    def values(self, channels: int) -> FloatArray:
        """What the codes stand for, (slots, channels)."""
        rows = [[code / 2.0**word.fraction for code in row] for word, row in zip(self.words, self.codes, strict=True)]
        return np.array(rows, dtype=np.float64).reshape(len(self.words), channels)


def store(diagram: Diagram, format: Fixed) -> Stored:
    """The diagram's coefficients as the format's `coefficients` place stores them.

    Raises FormatError for a coefficient that does not fit, or that is not 0 and would become 0, unless allowed.
    """
    rule = format.coefficients
    least = 1 if format.accumulator.bits is not None else None
    words: list[Word] = [Word(1, rule.bits - 1)] * len(diagram.slots)
    for group in _groups(diagram.slots, rule.point):
        word = rule.word or _group_word(diagram.values[group].ravel(), rule, least)
        for index in group:
            words[index] = word
    codes, vanished, clamped = [], 0, 0
    for slot, word, row in zip(diagram.slots, words, diagram.values, strict=True):
        exact = [rounded_value(Fraction(float(value)), word.fraction, rule.rounding) for value in row]
        kept = [saturated(code, word) for code in exact]
        clamped += _check_fit(slot, word, row, exact, kept, rule)
        vanished += _check_vanished(slot, word, row, kept, rule)
        codes.append(tuple(kept))
    return Stored(tuple(words), tuple(codes), vanished, clamped)


def _groups(slots: Sequence[Slot], point: str) -> Iterable[list[int]]:
    """Slots that share a binary point."""
    groups: dict[object, list[int]] = {}
    for index, slot in enumerate(slots):
        key: object = {
            "section": slot.section,
            "polynomial": (slot.section, slot.part),
            "realization": None,
            "coefficient": index,
        }[point]
        groups.setdefault(key, []).append(index)
    return groups.values()


def _group_word(values: FloatArray, rule: CoefficientRule, least: int | None) -> Word:
    """The smallest integer part for which every rounded value of a group fits; 1 for a group of zeros."""
    largest = max((abs(float(value)) for value in values), default=0.0)
    if largest == 0.0:
        return Word(1, rule.bits - 1)
    integer = frexp(largest)[1] - 1
    if least is not None:
        integer = max(integer, least)
    while not _all_fit(values, Word(integer, rule.bits - integer), rule.rounding):
        integer += 1
    return Word(integer, rule.bits - integer)


def _all_fit(values: FloatArray, word: Word, rounding: str) -> bool:
    codes = (rounded_value(Fraction(float(value)), word.fraction, rounding) for value in values)
    return all(word.low <= code <= word.high for code in codes)


def _check_fit(
    slot: Slot, word: Word, row: FloatArray, exact: list[int], kept: list[int], rule: CoefficientRule
) -> int:
    clamped = [i for i, code in enumerate(exact) if code != kept[i]]
    if clamped and not rule.allow_clamping:
        value = float(row[clamped[0]])
        step = 2.0**-word.fraction
        raise FormatError(
            f"The coefficient {slot.label} = {value:.10g} does not fit {word}, which runs from "
            f"{word.low * step:.10g} to {word.high * step:.10g}. Give the coefficients more integer bits, "
            f"scale the filter, or allow it with allow_clamping = true."
        )
    for code in kept:
        if int(float(code)) != code:
            raise FormatError(
                f"The coefficient {slot.label} would be clamped to {code}, the largest code of {word}, which is no float64, "
                f"and what is computed from coefficients would not be of this one. Give them one integer bit more."
            )
    return len(clamped)


def _check_vanished(slot: Slot, word: Word, row: FloatArray, kept: list[int], rule: CoefficientRule) -> int:
    vanished = [i for i, code in enumerate(kept) if code == 0 and row[i] != 0]
    if vanished and not rule.allow_vanishing:
        raise FormatError(
            f"The coefficient {slot.label} = {float(row[vanished[0]]):.6g} becomes 0 in {word}, whose step is "
            f"{2.0**-word.fraction:.6g}: a part of the filter would be gone. Give the coefficients more bits, "
            f'a point of their own (point = "polynomial" or "coefficient"), or allow it with '
            f"allow_vanishing = true."
        )
    return len(vanished)
