"""What a measurement says: a paragraph for each instrument, the verdict, and the same figures for a program."""

from collections.abc import Iterator

from streamhost.commands import verdict_text
from streamhost.commands.common import printable
from streamhost.commands.documents import document_of
from streamhost.commands.instruments import INSTRUMENTS, Asked
from streamhost.commands.measure_run import Found
from streamhost.measure.limits import SEED


def text(found: Found, asked: Asked, source: str | None) -> str:
    """The whole for a terminal."""
    realization = asked.realization
    head = f"{asked.preset.title}: {realization.form} · {realization.decomposition} · {realization.format.label}"
    paragraphs = [printable(head)]
    for instrument in INSTRUMENTS:
        if instrument.name in found.results:
            paragraphs.append("\n".join((f"{instrument.name}:", *instrument.lines(found.results[instrument.name]))))
    paragraphs += ["\n".join(_verdict(found)), "\n".join(printable(str(path)) for path in found.files),
                   "\n".join(conditions(found, asked, source))]
    return "\n\n".join(paragraph for paragraph in paragraphs if paragraph)


def misses(found: Found) -> list[str]:
    """A sentence for each limit that is missed, and one for what was broken off."""
    return [*(f"Misses {verdict_text.miss(verdict)}." for verdict in found.verdicts if not verdict.meets), *_broken_off(found)]


def _verdict(found: Found) -> Iterator[str]:
    met = sum(verdict.meets for verdict in found.verdicts)
    if found.verdicts and met == len(found.verdicts):
        yield "Meets " + ("its limit." if met == 1 else f"all {met} limits.")
    elif found.verdicts:
        yield f"Meets {met} of {len(found.verdicts)} limits."
    elif not found.not_asked:
        yield "The preset states no limits."
    yield from (f"Misses {verdict_text.miss(verdict)}." for verdict in found.verdicts if not verdict.meets)
    if found.not_asked:
        yield f"Not asked: {', '.join(found.not_asked)}."


def _broken_off(found: Found) -> Iterator[str]:
    if found.broken_off:
        parts = [name for name in found.broken_off if name in found.results]
        partly = f" What {parts[0]} had found by then is told above." if parts else ""
        yield f"Broken off: {', '.join(found.broken_off)}.{partly}"


def conditions(found: Found, asked: Asked, source: str | None) -> tuple[str, ...]:
    """What was broken off, and what the figures were found on."""
    return (*_broken_off(found), _signals(found, asked, source))


def _signals(found: Found, asked: Asked, source: str | None) -> str:
    given = printable(source) if source is not None else verdict_text.SIGNAL
    channels = asked.x.shape[1]
    heard = f"Input: {given}, {'1 channel' if channels == 1 else f'{channels} channels'}, {asked.realization.rate:g} Hz."
    return f"{heard} Limits were checked on {verdict_text.SIGNAL}." if source is not None and found.verdicts else heard


def document(found: Found, asked: Asked, source: str | None) -> dict[str, object]:
    """The figures under keys that are spelt with their unit, an object for each instrument that ran.

    `input`: as asked for, None for the noise on which limits are checked. `seed`: of that noise, None where it was not used.
    """
    preset, realization = asked.preset, asked.realization
    return {
        "preset": preset.source.name,
        "title": preset.title,
        "decomposition": realization.decomposition,
        "form": realization.form,
        "format": realization.format.label,
        "rate": realization.rate,
        "input": source,
        "seed": SEED if source is None or found.verdicts else None,
        "quick": asked.quick,
        "broken_off": found.broken_off,
        "files": [str(path) for path in found.files],
        **{name: document_of(result) for name, result in found.results.items()},
        "limits": {
            "met": all(verdict.meets for verdict in found.verdicts) if found.verdicts else None,
            "not_asked": list(found.not_asked),
            "verdicts": verdict_text.document(found.verdicts),
        },
    }
