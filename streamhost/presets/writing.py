"""A preset's text from a filter, such that reading it gives the filter back bit for bit."""

from collections.abc import Iterable, Sequence
from typing import TypeGuard

from streamhost.errors import FilterError
from streamhost.filters import Codes, Filter, Polynomials, ZerosPoles
from streamhost.presets.mistakes import one_line

NUMBERS_IN_A_LINE = 4
INDENT = "    "
SECTION = 3


def preset_text(filter: Filter, *, comments: Iterable[str] = ()) -> str:
    """The preset with this filter and nothing else: every other key is left to its default.

    `comments` stand at its head, a line each. Numbers have as many digits as float64 needs, so that the text reads back
    as the same filter. It does for whatever the class methods of `Filter` make, unless a division by a0 made a last
    coefficient vanish in float64: such a 0 is not kept. Raises FilterError for a filter with several outputs.
    """
    if filter.branches:
        raise FilterError(
            f"the filter has the outputs {', '.join(filter.outputs)}, and a preset states such a filter by its kind only."
        )
    head = [*(f"# {one_comment(comment)}" for comment in comments), f"rate = {_number(filter.rate)}"]
    return "\n".join(["\n".join(head), *(f"\n[[filter]]\n{table}" for table in _tables(filter))]) + "\n"


def one_comment(text: str) -> str:
    """The text on one line, nothing in it that ends a comment or acts on a terminal."""
    return "".join(character if character.isprintable() else one_line(character) for character in text)


def _tables(filter: Filter) -> list[str]:
    if filter.codes is not None:
        return [_of_codes(filter.codes)]
    tables: list[str] = []
    rows: list[Polynomials] = []
    for factor in filter.factors:
        if _is_row(factor):
            rows.append(factor)
            continue
        tables += _of_rows(rows)
        rows = []
        tables.append(_of_polynomials(factor) if isinstance(factor, Polynomials) else _of_roots(factor))
    return tables + _of_rows(rows)


def _is_row(factor: Polynomials | ZerosPoles) -> TypeGuard[Polynomials]:
    return isinstance(factor, Polynomials) and len(factor.b) == len(factor.a) == SECTION


def _of_rows(rows: Sequence[Polynomials]) -> list[str]:
    """One table of sections, or none."""
    lines = [f"{INDENT}[{', '.join(map(_number, (*row.b, *row.a)))}],\n" for row in rows]
    return [f"sections = [\n{''.join(lines)}]"] if lines else []


def _of_codes(codes: Codes) -> str:
    """In five columns: reading puts a0 in, whether the word holds it or not."""
    rows = [f"{INDENT}[{', '.join(map(str, (*row[:3], *row[4:])))}],\n" for row in codes.rows]
    return f'sections = {{ word = "{codes.word}", codes = [  # b0 b1 b2 a1 a2\n{"".join(rows)}] }}'


def _of_polynomials(factor: Polynomials) -> str:
    b = f"b = {_list(map(_number, factor.b))}"
    return b if factor.a == (1.0,) else f"{b}\na = {_list(map(_number, factor.a))}"


def _of_roots(factor: ZerosPoles) -> str:
    """The delay is written as roots at 0 on the side that has fewer than it takes."""
    padding = factor.delay + len(factor.zeros) - len(factor.poles)
    zeros = [*factor.zeros, *([0j] * -padding)]
    poles = [*factor.poles, *([0j] * padding)]
    return f"zeros = {_list(map(_root, zeros))}\npoles = {_list(map(_root, poles))}\nfactor = {_number(factor.gain)}"


def _root(root: complex) -> str:
    return f"[{_number(root.real)}, {_number(root.imag)}]" if root.imag else _number(root.real)


def _list(entries: Iterable[str]) -> str:
    entries = list(entries)
    if len(entries) <= NUMBERS_IN_A_LINE:
        return f"[{', '.join(entries)}]"
    starts = range(0, len(entries), NUMBERS_IN_A_LINE)
    lines = [f"{INDENT}{', '.join(entries[i : i + NUMBERS_IN_A_LINE])},\n" for i in starts]
    return f"[\n{''.join(lines)}]"


def _number(value: float) -> str:
    """The shortest decimal that is this float64 and no other."""
    return repr(float(value))
