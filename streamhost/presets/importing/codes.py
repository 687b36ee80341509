"""Integers: codes of a stated word, or refused where no word is stated."""

from fractions import Fraction

from streamhost.errors import RequestError
from streamhost.filters import entry
from streamhost.presets.importing.stated import Number, Section, Sections, refused


def one_of(word: str | None) -> int:
    """What 1 is written as: the code of 1 in the word. FilterError where the word is none."""
    return 1 if word is None else 1 << entry.word(word)[1]


def checked(sections: Sections, word: str | None) -> tuple[Sections, tuple[str, ...]]:
    """The sections with every code within its word, and notes. RequestError where codes and word do not agree."""
    numbers = [number for section in sections for number in section.numbers]
    if word is None:
        if all(isinstance(number.value, int) for number in numbers):
            raise RequestError(
                "the file has integers only. If they are codes, state their word, for instance --word Q2.14: a code is "
                "the value times 2^14. If they are the values themselves, write one of them with a point: 1.0."
            )
        return sections, ()
    return tuple(_coded(section, word) for section in sections), _notes(numbers, word)


def value(number: Number, word: str | None) -> Fraction:
    """What the number stands for, exactly."""
    return Fraction(number.value) / one_of(word)


def _notes(numbers: list[Number], word: str) -> tuple[str, ...]:
    turned = sum(number.pattern and _code(number, word) != number.value for number in numbers)
    note = f"word: {word}, the value of a code c is c / {one_of(word)}, as asked"
    return (note, f"hexadecimal: {turned} read as two's complement, since above the largest code") if turned else (note,)


def _coded(section: Section, word: str) -> Section:
    one = one_of(word)
    if section.a0 and section.a0.value != one:
        remedy = "" if fits(one, word) else " The word does not hold 1: leave a0 out, in the file or by a - in --columns."
        raise refused(section.a0.place, f"a0 is {section.a0.value}; among codes of {word} it can only be {one}, the code of 1."
                                        f"{remedy}")
    return Section(
        tuple(_within(number, word) for number in section.b), section.a0,
        tuple(_within(number, word) for number in section.feedback),
    )


def _within(number: Number, word: str) -> Number:
    if not isinstance(number.value, int):
        raise refused(number.place, f"{number.value!r} is no integer; a code of {word} is one. Leave --word out for values.")
    code, limit = _code(number, word), _limit(word)
    if not -limit <= code < limit:
        raise refused(number.place, f"{number.value} is no code of {word}, which has {-limit} to {limit - 1}.")
    return Number(code, number.place)


def fits(code: int, word: str) -> bool:
    limit = _limit(word)
    return -limit <= code < limit


def _limit(word: str) -> int:
    return 1 << (sum(entry.word(word)) - 1)


def _code(number: Number, word: str) -> int:
    """The code; the bits of a negative one, written in hexadecimal, are above the largest by less than twice."""
    assert isinstance(number.value, int)
    limit = _limit(word)
    return number.value - 2 * limit if number.pattern and limit <= number.value < 2 * limit else number.value
