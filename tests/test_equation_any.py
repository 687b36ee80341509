"""Whatever is written: a filter, or a FilterError that shows the place."""

import math

from hypothesis import given
from hypothesis import strategies as st
from test_equation_in import READ, REFUSED

from streamhost.errors import FilterError
from streamhost.filters import Filter

PIECES = ["x[n]", "y[n]", "x[n-1]", "y(n-2)", " ", "\n", "=", "+", "-", "*", "/", "(", ")", "[", "]", "n", "0", "1/3",
          "2.5", "1e-9", "1e300", "1e999", "#", "n-1", "x", "y", "z", "-1", ".", "e", "\t", "\N{MINUS SIGN}",
          "9" * 30, "9" * 1001]
WRITTEN = [*READ, *REFUSED]


def filter_or_error(text: str) -> Filter | None:
    try:
        made = Filter.from_equation(text, rate=48000)
    except FilterError as error:
        told, *place = str(error).split("\n")
        assert told.startswith("equation")
        assert told.isprintable()
        if place:
            shown, mark = place
            assert shown.isprintable()
            assert mark.strip() == "^"
            assert len(mark) <= len(shown) + 1
        else:
            assert "empty" in told
        return None
    assert all(math.isfinite(c) for side in made.whole() for c in side)
    return made


@given(st.text())
def test_any_text(text: str) -> None:
    filter_or_error(text)


@given(st.lists(st.sampled_from(PIECES), max_size=40).map("".join))
def test_any_pieces(text: str) -> None:
    filter_or_error(text)


@given(st.lists(st.sampled_from(PIECES), max_size=12).map("".join))
def test_any_pieces_behind_an_equation(text: str) -> None:
    filter_or_error(f"y[n] = x[n]{text}")


@given(st.sampled_from(WRITTEN), st.integers(0, 30), st.integers(0, 6), st.text(max_size=3))
def test_an_equation_with_a_hole(text: str, start: int, length: int, filling: str) -> None:
    filter_or_error(text[:start] + filling + text[start + length:])


@given(st.sampled_from(list(READ)), st.data())
def test_blanks_between_words_change_nothing(text: str, data: st.DataObject) -> None:
    cuts = [i for i, c in enumerate(text) if c in "[]()=+*/" and "e+" not in text[i - 1: i + 1] and "#" not in text]
    expected = filter_or_error(text)
    for i in sorted(data.draw(st.sets(st.sampled_from(cuts))) if cuts else (), reverse=True):
        text = text[:i] + data.draw(st.sampled_from([" ", "\n", " \n\t "])) + text[i:]
    assert expected is not None
    assert filter_or_error(text) == expected
