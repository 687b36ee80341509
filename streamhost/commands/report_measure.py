"""The report of `streamhost measure`."""

from collections.abc import Iterator
from pathlib import Path

from streamhost.commands import measure_text
from streamhost.commands.common import Ledger, version, write_json
from streamhost.commands.compare import label
from streamhost.commands.instruments import INSTRUMENTS, Asked
from streamhost.commands.measure_run import Found
from streamhost.commands.reporting import command_line, counts_of, documents_of, drawing_of, sounds_of
from streamhost.commands.verdict_text import SIGNAL
from streamhost.report import FIGURES, INDEX, Contents, Lane, Section, Table, page, report_folder
from streamhost.report.words import several


def write_measured(name: str, found: Found, asked: Asked, source: str | None, *, force: bool) -> None:
    """The report of a measurement, of what is done where it was broken off."""
    preset, realization = asked.preset, asked.realization
    with report_folder(Path(name), force=force) as folder:
        lane = Lane(
            number=1, title=preset.title, form=label(realization), short=label(realization),
            states_limits=bool(found.verdicts), verdicts=found.verdicts, results=found.results, facts=(),
            drawing=drawing_of(realization), counts=counts_of(realization),
            sounds=sounds_of(folder, found.results, realization.rate),
        )
        channels = several(asked.x.shape[1], "channel")
        contents = Contents(
            heading=f"{preset.title}, measured", lanes=(lane,), version=version(), command=command_line(),
            source=f"{source}, {channels}, {realization.rate:g} Hz" if source is not None else SIGNAL,
            rate=realization.rate, band=asked.band, limit_signal=SIGNAL, sections=tuple(_sections(found)),
            documents=documents_of(folder, found.results),
            conditions=measure_text.conditions(found, asked, source),
        )
        (folder / INDEX).write_text(page(contents), encoding="utf-8")
        write_json(str(folder / FIGURES), measure_text.document(found, asked, source))


def _sections(found: Found) -> Iterator[Section]:
    """What each instrument says."""
    for instrument in INSTRUMENTS:
        if instrument.name in found.results:
            said = instrument.lines(found.results[instrument.name])
            yield Section(instrument.name.replace("_", " ").capitalize(), tuple(
                Table(each.heads, each.cells, each.numeric) if isinstance(each, Ledger) else each for each in said))
