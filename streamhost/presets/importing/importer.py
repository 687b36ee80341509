"""From a file of coefficients to a filter, with a note of everything that was decided on the way."""

from dataclasses import dataclass
from pathlib import Path

from streamhost.errors import RequestError
from streamhost.filters import Filter, entry
from streamhost.presets.importing import building, codes, feedback
from streamhost.presets.importing.columns import arranged, parse_columns
from streamhost.presets.importing.content import read
from streamhost.presets.importing.stated import Reading, Roots, Sections, checked_count
from streamhost.presets.mistakes import listed


@dataclass(frozen=True)
class Imported:
    """The filter, and what was decided to make it, one line each."""

    filter: Filter
    notes: tuple[str, ...]


@dataclass(frozen=True)
class Asked:
    """What the user states beside the file: columns such as "b0,b1,b2,a1,a2", feedback, the word of codes."""

    columns: str | None = None
    feedback: str | None = None
    word: str | None = None


def import_filter(
    path: str | Path, *, rate: float, columns: str | None = None, feedback: str | None = None, word: str | None = None
) -> Imported:
    """The filter that a file of coefficients states, at `rate` in hertz.

    The file is one of: lines of text with a section each, or with b and with a; JSON; a NumPy archive; C source with
    arrays. `columns` names what stands in a row, `feedback` is "subtracted" (the transfer function's sign) or "added",
    `word` is that of integer codes, such as "Q2.14". What is left out is found in the file or asked for.

    Raises RequestError, which names the file and the place in it; MachineError where the file cannot be read.
    """
    path, asked = Path(path), Asked(columns, feedback, word)
    entry.rate(rate)
    try:
        return _imported(read(path), asked, rate)
    except RequestError as error:
        raise RequestError(f"{_shown(path)}: {error}") from None


def _imported(reading: Reading, asked: Asked, rate: float) -> Imported:
    if isinstance(reading.stated, Roots):
        return Imported(_of_roots(reading.stated, asked, rate), reading.notes)
    columns = parse_columns(asked.columns) if asked.columns is not None else None
    sections, arrangement = arranged(reading.stated, columns, codes.one_of(asked.word))
    checked_count(sum(len(section.numbers) for section in sections))
    building.checked_a0(sections)
    sections, scale = codes.checked(sections, asked.word)
    made, added, sign = feedback.signed(
        sections, asked.feedback, lambda added: building.built(sections, asked.word, added=added, rate=rate)
    )
    notes = (*reading.notes, *arrangement, *scale, *sign, *_note_on_codes(sections, asked.word, added))
    return Imported(made, notes)


def _shown(path: Path) -> str:
    return str(path) if str(path).isprintable() else repr(str(path))


def _of_roots(roots: Roots, asked: Asked, rate: float) -> Filter:
    needless = [f"--{name}" for name, value in vars(asked).items() if value is not None]
    if needless:
        raise RequestError(f"the file has zeros and poles, which need no {listed(needless)}. Leave it out.")
    return Filter.from_zeros_poles(roots.zeros, roots.poles, roots.factor, rate=rate)


def _note_on_codes(sections: Sections, word: str | None, added: bool) -> tuple[str, ...]:
    if word is None or building.keeps_codes(sections, word, added=added):
        return ()
    told = (
        "codes: written as their values, since a preset holds only sections as codes, and only within their word; "
        f'coefficients = "{word}" under [format] makes them codes again'
    )
    return (told,)
