"""The page: verdict, ledgers, figures, sound, and the command that made it. It needs nothing but itself and its audio."""

import json
from base64 import b64encode
from collections.abc import Iterator
from hashlib import sha256
from importlib.resources import files
from typing import Any
from urllib.parse import quote

from streamhost.report.contents import Contents, Lane, Sound
from streamhost.report.figure import figure_html
from streamhost.report.figures import FIGURES
from streamhost.report.ledger import facts_ledger, limits_ledger, reasons, table
from streamhost.report.verdict import verdict
from streamhost.report.words import escape

GENERATOR = "streamhost report"

CAUTION = ("Caution: a raised difference is loud, and so is what oscillates. Players start at a tenth of full volume. Turn "
           "your own volume down before you begin.")


def page(contents: Contents) -> str:
    """The whole as HTML."""
    style, script = asset("page.css"), asset("charts.js")
    figures, data = _figures(contents)
    return "\n".join([
        "<!doctype html>", '<html lang="en">', "<head>", '<meta charset="utf-8">',
        f'<meta http-equiv="Content-Security-Policy" content="{policy(style, script)}">',
        '<meta name="viewport" content="width=device-width, initial-scale=1">',
        '<meta name="color-scheme" content="light dark">',
        f'<meta name="generator" content="{GENERATOR} {escape(contents.version)}">',
        f"<title>{escape(contents.heading)}</title>",
        f"<style>{style}</style>", "</head>", "<body>", _hatching(), "<main>",
        *_top(contents), "<h2>Figures</h2>", '<p class="hint" id="zooming" hidden></p>', *figures,
        *_sections(contents), *_sound(contents), *_made(contents), "</main>",
        '<p id="told" class="unseen" aria-live="polite"></p>',
        f'<script type="application/json" id="charts">{_json(data)}</script>', f"<script>{script}</script>",
        "</body>", "</html>", "",
    ])


def asset(name: str) -> str:
    """A file of this package's."""
    return (files("streamhost.report") / name).read_text(encoding="utf-8")


def policy(style: str, script: str) -> str:
    """Nothing from elsewhere, no script but ours, told by its hash; audio from beside the page."""
    return (f"default-src 'none'; style-src '{_hash(style)}'; script-src '{_hash(script)}'; media-src 'self' file:; "
            "base-uri 'none'; form-action 'none'")


def _hash(text: str) -> str:
    return "sha256-" + b64encode(sha256(text.encode("utf-8")).digest()).decode("ascii")


def _json(data: dict[str, Any]) -> str:
    """Inside a script element no text may end it."""
    return json.dumps(data, separators=(",", ":"), allow_nan=False).replace("<", "\\u003c")


def _hatching() -> str:
    return ('<svg class="unseen" width="0" height="0" aria-hidden="true"><pattern id="hatch" width="5" height="5" '
            'patternUnits="userSpaceOnUse" patternTransform="rotate(45)"><path d="M0 0V5"/></pattern></svg>')


def _top(contents: Contents) -> Iterator[str]:
    yield f'<p class="heading">{escape(contents.heading)}</p>'
    yield f'<h1>{escape(verdict(contents))}</h1>'
    if limits := limits_ledger(contents):
        yield f'<h2>Limits</h2><div class="scroll" tabindex="0" role="region" aria-label="Limits">{limits}</div>'
        yield f'<p class="method">Checked on {escape(contents.limit_signal)}. {escape(" ".join(reasons(contents)))}</p>'
    elif len(contents.lanes) > 1:
        yield from (f'<p><b>{lane.number}</b> {escape(lane.title)} <span class="quiet">{escape(lane.form)}</span></p>'
                    for lane in contents.lanes)
    else:
        yield f'<p class="quiet">{escape(contents.lanes[0].form)}</p>'
    if facts := facts_ledger(contents):
        yield f"<h2>On {escape(contents.source)}</h2>"
        yield f'<div class="scroll" tabindex="0" role="region" aria-label="Figures on the signal">{facts}</div>'
    yield f'<p class="method">{escape(" ".join(contents.conditions))}</p>'
    if contents.remarks:
        yield f"<h2>Remarks</h2>{''.join(f'<p>{escape(remark)}</p>' for remark in contents.remarks)}"


def _sections(contents: Contents) -> Iterator[str]:
    """What instruments say of a single realization."""
    for section in contents.sections:
        yield f"<h2>{escape(section.name)}</h2>"
        yield from (f"<p>{escape(part)}</p>" if isinstance(part, str) else table(part, section.name) for part in section.parts)


def _figures(contents: Contents) -> tuple[list[str], dict[str, Any]]:
    pieces: list[str] = []
    data: dict[str, Any] = {}
    for figure in (each for maker in FIGURES for each in maker(contents)):
        html, own = figure_html(figure, len(pieces) + 1)
        pieces.append(html)
        data |= own
    return pieces, data


def _sound(contents: Contents) -> Iterator[str]:
    if not any(lane.sounds for lane in contents.lanes):
        return
    yield f'<section class="sound"><h2>Sound</h2><p class="caution">{CAUTION}</p>'
    for lane in contents.lanes:
        yield f'<div class="players"><p class="head"><b>{lane.number}</b> {escape(lane.form)}</p>'
        yield from (_player(lane, sound) for sound in lane.sounds)
        yield from (f'<p class="none">{escape(reason)}</p>' for reason in lane.silent)
        yield "</div>"
    yield "</section>"


def _player(lane: Lane, sound: Sound) -> str:
    return (f'<p class="player"><span>{escape(sound.name)}</span><audio controls preload="none" '
            f'src="{escape(quote(str(sound.file)))}" aria-label="{escape(f"{lane.number}: {sound.name}")}"></audio></p>')


def _made(contents: Contents) -> Iterator[str]:
    if contents.documents:
        links = ", ".join(f'<a href="{escape(quote(str(file)))}">{escape(file.name)}</a>' for file in contents.documents)
        yield f"<h2>Proofs</h2><p>{links}</p>"
    yield "<h2>Made by</h2>"
    yield f'<pre tabindex="0">{escape(contents.command)}</pre>'
    version = escape(contents.version)
    yield f'<p class="method">streamhost {version}. All figures, and more, are in figures.json beside this page.</p>'
