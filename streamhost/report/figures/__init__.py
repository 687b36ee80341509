"""The figures of a report, a small file for each; a new instrument's is one file and one line here."""

from collections.abc import Callable, Iterator

from streamhost.report.contents import Contents
from streamhost.report.figure import Figure
from streamhost.report.figures import drawings, limit_cycles, noise, overflow, recovery, response, roots, tones, transients

FIGURES: tuple[Callable[[Contents], Iterator[Figure]], ...] = (
    drawings.figures,
    response.figures,
    roots.figures,
    noise.figures,
    overflow.figures,
    recovery.figures,
    limit_cycles.figures,
    transients.figures,
    tones.figures,
)
"""In the order of the page. Each gives its figures, or none where the results it shows are not there."""
