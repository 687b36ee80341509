"""The ledgers: limits, figures on the signal, what instruments tell."""

from collections.abc import Iterator, Sequence

from streamhost.measure.limits import AT_MOST, Verdict
from streamhost.report.contents import Contents, Lane, Table
from streamhost.report.words import escape, number, short

HEADS = {
    "noise_dbfs": "Noise, dBFS", "response_deviation_db": "Response, dB off", "leak_db": "Leak, dB",
    "mask": "Inside the mask, dB", "headroom_db": "Headroom, dB", "multiplications": "Multiply", "memory_words": "Words",
}
MOST_DECIMALS = 3
MOST_AT_FULL_SIZE = 3


def limits_ledger(contents: Contents) -> str:
    """A row for each realization, a column for each limit; what misses is in reverse, with what is allowed."""
    keys = list(dict.fromkeys((verdict.key, verdict.output, verdict.rule, verdict.allowed)
                              for lane in contents.lanes for verdict in lane.verdicts))
    columns = list(dict.fromkeys((key, output) for key, output, _, _ in keys))
    if not columns:
        return ""
    heads = "".join(f'<th scope="col" class="figure">{escape(HEADS.get(key, key))}{f"<br>{escape(output)}" if output else ""}'
                    f"{_allowed(keys, key, output)}</th>" for key, output in columns)
    rows = []
    for lane in contents.lanes:
        cells = "".join(_limit_cell([each for each in lane.verdicts if (each.key, each.output) == column])
                        for column in columns)
        name = _name_cells(lane, best=lane is contents.best and lane.meets)
        rows.append(f'{name}<td class="word">{_word(lane)}</td>{cells}</tr>')
    size = ' class="many"' if len(columns) > MOST_AT_FULL_SIZE else ""
    first = '<th></th><th scope="col">Realization</th><th scope="col" class="word">Verdict</th>'
    return f"<table{size}><thead><tr>{first}{heads}</tr></thead><tbody>{''.join(rows)}</tbody></table>"


def _allowed(keys: Sequence[tuple[str, str, str, float]], key: str, output: str) -> str:
    """What is allowed, in the head where it is the same for all."""
    rules = {(rule, allowed) for each, of, rule, allowed in keys if (each, of) == (key, output)}
    if len(rules) != 1:
        return ""
    rule, allowed = next(iter(rules))
    return f'<span class="quiet">{rule} {short(allowed)}</span>'


def _name_cells(lane: Lane, *, best: bool) -> str:
    row = '<tr class="best">' if best else "<tr>"
    return (f'{row}<th scope="row" class="numeral">{lane.number}</th>'
            f'<td class="name">{escape(lane.title)}<span class="quiet">{escape(lane.form)}</span></td>')


def _limit_cell(verdicts: Sequence[Verdict]) -> str:
    if not verdicts:
        return '<td class="figure">–</td>'
    worst = min(verdicts, key=lambda each: each.meets)
    if worst.meets:
        return f'<td class="figure">{shown(worst)}</td>'
    found = "no figure" if worst.found is None else shown(worst)
    allowed = f"{worst.rule} {short(worst.allowed)}"
    return f'<td class="figure"><span class="miss"><span>{found},</span> <span>{allowed}</span></span></td>'


def shown(verdict: Verdict) -> str:
    """What was found, with one decimal more than the limit, and more where that would hide a miss."""
    assert verdict.found is not None, "there is a figure"
    decimals = min(MOST_DECIMALS, len(f"{verdict.allowed:f}".rstrip("0").partition(".")[2]) + 1)
    if float(verdict.found).is_integer() and float(verdict.allowed).is_integer():
        decimals = 0
    while not verdict.meets and decimals < 17 and _hides(round(verdict.found, decimals), verdict):
        decimals += 1
    return number(verdict.found, decimals)


def _hides(found: float, verdict: Verdict) -> bool:
    return found <= verdict.allowed if verdict.rule == AT_MOST else found >= verdict.allowed


def _word(lane: Lane) -> str:
    if lane.states_limits or not lane.verdicts:
        return lane.word
    return f'{lane.word}<span class="quiet">would {"miss" if lane.misses else "meet"}</span>'


def reasons(contents: Contents) -> Iterator[str]:
    """Why a limit has no figure."""
    for lane in contents.lanes:
        for reason in dict.fromkeys(verdict.reason for verdict in lane.verdicts if verdict.found is None and verdict.reason):
            yield f"{lane.number}: no figure, since {reason}."


def facts_ledger(contents: Contents) -> str:
    """What was found on the given signal, and what a realization costs."""
    heads = list(dict.fromkeys(head for lane in contents.lanes for _, facts in lane.facts for head in facts))
    if not heads:
        return ""
    cells = "".join(f'<th scope="col" class="figure">{_head(head)}</th>' for head in heads)
    rows = "".join(
        f'<tr><th scope="row" class="numeral">{lane.number} {escape(output)}</th>'
        + "".join(f'<td class="figure">{escape(facts.get(head, ""))}</td>' for head in heads) + "</tr>"
        for lane in contents.lanes for output, facts in lane.facts)
    return f'<table class="facts"><thead><tr><th></th>{cells}</tr></thead><tbody>{rows}</tbody></table>'


def _head(head: str) -> str:
    name, _, unit = head.partition(", ")
    return escape(name) + _unit(unit)


def table(told: Table, name: str) -> str:
    """A table of an instrument's; a column that holds numbers is set to the right."""
    sides = ["figure" if numeric else "text" for numeric in told.numeric]
    heads = "".join(f'<th scope="col" class="{side}">{escape(head)}{_unit(unit)}</th>'
                    for (head, unit), side in zip(told.heads, sides, strict=True))
    rows = ["".join(f'<td class="{side}">{escape(cell)}</td>' for cell, side in zip(row, sides, strict=True))
            for row in told.cells]
    body = "".join(f"<tr>{row}</tr>" for row in rows)
    return (f'<div class="scroll" tabindex="0" role="region" aria-label="{escape(name)}"><table class="facts">'
            f"<thead><tr>{heads}</tr></thead><tbody>{body}</tbody></table></div>")


def _unit(unit: str) -> str:
    return f'<span class="quiet">{escape(unit)}</span>' if unit else ""
