"""The control page beside a run: its address said, its browser opened."""

import webbrowser
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager, suppress
from typing import TYPE_CHECKING

import click

from streamhost.commands.listening.asked import Asked

if TYPE_CHECKING:
    from streamhost.host import Host
    from streamhost.presets import Preset
    from streamhost.realization import Realization


@contextmanager
def serve(
    host: "Host", presets: "Sequence[Preset]", asked: Asked
) -> "Iterator[Callable[[], None]]":
    """Serve the page of a host that this process drives; what it gives is to be called before every block."""
    from streamhost.page import ClockSitting, Page

    sitting = ClockSitting(host, [preset.title for preset in presets], asked.monitor_db)
    with Page(sitting, section_drawing, asked.port) as page:
        click.echo(f"The page is {page.address}   Ctrl-C ends.", err=True)
        if not asked.no_browser:
            webbrowser.open(page.address)

        def attend() -> None:
            page.attend()
            sitting.tend()

        yield attend


def section_drawing(realization: "Realization") -> tuple[str, str]:
    """The diagram of a realization, of a cascade its first section, with marks where it rounds; and its caption."""
    from streamhost.commands.draw import drawn_diagram, rounded_nodes
    from streamhost.drawing import svg
    from streamhost.errors import StreamhostError

    shown, said = realization, f"{realization.form} · {realization.decomposition}, {realization.format.label}"
    sections = realization.built.sections
    if realization.decomposition == "cascade" and len(sections) > 1:
        with suppress(StreamhostError):
            shown = _one_section(realization)
            said = f"section 1 of {len(sections)}: {realization.form}, {realization.format.label}"
    drawing = svg(drawn_diagram(shown), rounded=rounded_nodes(shown), values="none")
    counts = shown.diagram.counts()
    return drawing, (f"{said}; {counts.multiplications} products, {counts.additions} sums, {counts.delays} delays.")


def _one_section(realization: "Realization") -> "Realization":
    """The first section of a cascade alone, drawn as it stands there."""
    from streamhost.filters import Filter
    from streamhost.realization import realize

    alone = Filter(realization.rate, (realization.built.sections[0],), sections_given=True)
    return realize(alone, form=realization.form, format=realization.format, allow_unstable=True)
