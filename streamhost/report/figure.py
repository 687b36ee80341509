"""A figure: panels on common axes, a caption in sentences, and how it was made."""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from html import escape as quoted
from typing import Any

from streamhost.report.chart import Chart, Line
from streamhost.report.contents import Contents, Lane
from streamhost.report.svg import chart_data, chart_svg
from streamhost.report.words import escape, sentence

SIZES = {1: (760.0, 300.0), 2: (372.0, 224.0), 3: (242.0, 184.0), 4: (178.0, 160.0)}
"""Of a chart, by how many stand in a row; columns are 16 px apart."""


@dataclass(frozen=True)
class Panel:
    """One chart or, where there is none, the reason in words; svg: a drawing that is not a chart. head: what it is of."""

    head: str
    numerals: str = ""
    chart: Chart | None = None
    note: str = ""
    svg: str = ""
    high: float | None = None


@dataclass(frozen=True)
class Figure:
    """caption: sentences with values; method: method, band, reference and seed. columns: in a row, by itself unless given."""

    caption: str
    method: str
    panels: tuple[Panel, ...]
    columns: int | None = None


def columns_of(panels: int) -> int:
    """Panels in a row: four at most, and three where that leaves fewer gaps."""
    if panels <= 4:
        return max(panels, 1)
    return 3 if panels % 3 == 0 or panels in (5, 11) else 4


def lane_panel(lane: Lane, chart: Chart | None, note: str = "") -> Panel:
    """The panel of one realization; the note stands where there is no chart."""
    return Panel(lane.short, str(lane.number), chart, "" if chart is not None else note)


def with_ghost(contents: Contents, charts: dict[int, Chart]) -> dict[int, Chart]:
    """In each chart but its own the best one's curve, as a thin line below the others."""
    best = contents.best
    if best is None or best.number not in charts:
        return charts
    ghost = [replace(item, role="ghost", label=str(best.number)) for item in charts[best.number].items
             if isinstance(item, Line) and item.role == "heard"]
    return {number: chart if number == best.number else replace(chart, items=(*ghost, *chart.items))
            for number, chart in charts.items()}


def figure_html(figure: Figure, number: int) -> tuple[str, dict[str, Any]]:
    """The figure as HTML, and the data of its charts by key."""
    columns = figure.columns or columns_of(len(figure.panels))
    data: dict[str, Any] = {}
    pieces = [f'<figure id="figure-{number}"><div class="panels of-{columns}">']
    for place, panel in enumerate(figure.panels, 1):
        pieces.append("".join(_panel(panel, f"f{number}-{place}", columns, data)))
    pieces.append(f'</div><figcaption><p><b>{number}</b> {escape(figure.caption)}</p>'
                  f'<p class="method">{escape(figure.method)}</p></figcaption></figure>')
    return "\n".join(pieces), data


def _panel(panel: Panel, key: str, columns: int, data: dict[str, Any]) -> Iterator[str]:
    yield f'<div class="panel"><p class="head"><b>{escape(panel.numerals)}</b> {escape(panel.head)}</p>'
    if panel.chart is not None:
        wide, high = SIZES[columns]
        high = panel.high or high
        data[key] = chart_data(panel.chart, wide, high)
        yield chart_svg(panel.chart, key, wide, high)
    if panel.svg:
        yield f'<div class="drawing" tabindex="0" role="group" aria-label="{quoted(panel.head)}">{panel.svg}</div>'
    if panel.note:
        yield f'<p class="none">{escape(sentence(panel.note))}</p>'
    yield "</div>"


def shown_in(lanes: Sequence[Lane], name: str) -> list[tuple[Lane, Any]]:
    """The realizations with a result of an instrument."""
    return [(lane, lane.results[name]) for lane in lanes if lane.results.get(name) is not None]
