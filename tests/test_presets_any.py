"""Whatever is written: a preset, or an error that says why not."""

import math

from hypothesis import given
from hypothesis import strategies as st
from test_presets import FILTERS, FORMATS, MANY, WHOLE

from streamhost.errors import PresetError
from streamhost.presets import parse_preset

LINES = WHOLE.splitlines(keepends=True) + MANY.splitlines(keepends=True) + [
    f"[[filter]]\n{table}" for table in FILTERS
] + [f"{table}\n" for table in FORMATS]
VALUES = st.one_of(
    st.floats().map(repr), st.integers().map(str), st.text(max_size=5).map(lambda text: f"'{text}'"),
    st.sampled_from(["true", "[]", "[[]]", "{}", "[1, [2]]", "1979-05-27", "{ word = [1] }", "{ bits = {} }"]),
    st.sampled_from(['"float32"', '"Q1.31"', '"full"', '{ word = "Q2.14", rounding = "floor" }', "{ bits = 40 }"]),
)
KEYS = st.sampled_from([line.partition(" = ")[0] for line in LINES if " = " in line and "\n" not in line.strip()])
assigned = st.builds("{} = {}\n".format, KEYS, VALUES)
pieces = st.one_of(st.sampled_from(LINES), assigned, st.text(max_size=8))


def preset_or_error(text):
    try:
        preset = parse_preset(text)
    except PresetError as error:
        assert error.problems
        for told in error.problems:
            assert told.startswith("preset:")
            assert told.isprintable(), told
        return
    assert math.isfinite(preset.rate)
    assert preset.rate > 0


@given(st.lists(pieces, max_size=25).map("".join))
def test_any_lines_give_a_preset_or_an_error(text):
    preset_or_error(text)


@given(st.data())
def test_a_preset_with_some_lines_replaced_gives_a_preset_or_an_error(data):
    lines = WHOLE.splitlines(keepends=True)
    for _ in range(data.draw(st.integers(1, 3))):
        index = data.draw(st.integers(0, len(lines) - 1))
        key = lines[index].partition(" = ")[0]
        lines[index] = data.draw(st.one_of(pieces, VALUES.map(f"{key} = {{}}\n".format)))
    preset_or_error("".join(lines))


@given(st.integers(0, len(WHOLE)), st.integers(0, 12), st.text(max_size=4))
def test_a_preset_with_a_hole_gives_a_preset_or_an_error(start, length, filling):
    preset_or_error(WHOLE[:start] + filling + WHOLE[start + length :])
