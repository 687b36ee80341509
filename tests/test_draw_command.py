"""`streamhost draw`."""

from pathlib import Path

import pytest
from drawing_reader import page_of

from streamhost.commands.main import main
from streamhost.filters import Filter
from streamhost.presets import load_preset
from streamhost.presets.realizing import realize_preset
from streamhost.shipped import resolve

PRESET = "rumble-naive-16-bit"


def test_plain_text_by_default(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["draw", PRESET]) == 0
    assert "x[n] --*--[b0>--->(+)===========*-> y[n]" in capsys.readouterr().out


def test_the_equation_below_reads_back(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["draw", PRESET]) == 0
    drawing, _, equation = capsys.readouterr().out.rpartition("\n\n")
    assert drawing.endswith("\nRecursive along the = wires; the impulse response does not end.")
    drawn = realize_preset(load_preset(resolve(PRESET, "preset"))).diagram
    value = dict(zip((slot.label for slot in drawn.slots), drawn.values[:, 0].tolist(), strict=True))
    b, a = Filter.from_equation(equation, rate=48000).whole()
    assert b == (value["b0"], value["b1"], value["b2"])
    assert a == (1.0, value["a1"], value["a2"])


def test_an_equation_for_each_node_on_request(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["draw", PRESET, "--equation"]) == 0
    by_node = realize_preset(load_preset(resolve(PRESET, "preset"))).diagram.equation(nodes=True)
    assert capsys.readouterr().out.endswith(f"\n\n{by_node}\n")
    assert main(["draw", PRESET, "--equation", "-o", str(tmp_path / "drawing.svg")]) == 0
    assert capsys.readouterr().out == f"{by_node}\n"


def test_values_where_asked(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    texts = {}
    for values in ("table", "beside", "none"):
        file = tmp_path / f"{values}.svg"
        assert main(["draw", PRESET, "--values", values, "-o", str(file)]) == 0
        texts[values] = file.read_text(encoding="utf-8")
    assert ">0.997411<" in texts["table"]
    assert ">0.99741<" in texts["beside"]
    assert "0.997" not in texts["none"]
    assert main(["draw", PRESET, "--values", "none"]) == 0
    assert "0.997411 " not in capsys.readouterr().out
    assert main(["draw", PRESET, "--values", "around"]) == 2
    capsys.readouterr()


def test_an_svg_file_that_is_not_overwritten(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    file = tmp_path / "drawing.svg"
    assert main(["draw", PRESET, "-o", str(file)]) == 0
    first = file.read_text(encoding="utf-8")
    assert page_of(first).marks == {}
    assert main(["draw", PRESET, "-o", str(file), "--rounded"]) != 0
    assert file.read_text(encoding="utf-8") == first
    assert main(["draw", PRESET, "-o", str(file), "--rounded", "--force"]) == 0
    assert len(page_of(file.read_text(encoding="utf-8")).marks) == 1
    capsys.readouterr()


@pytest.mark.parametrize("name", ["drawing.png", "drawing.pdf", "drawing"])
def test_other_kinds_of_picture_are_refused_before_anything_is_made(
    name: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    file = tmp_path / name
    assert main(["draw", PRESET, "-o", str(file)]) == 2
    assert f'"{file}" does not end in .svg' in capsys.readouterr().err
    assert not file.exists()


def test_one_realization_at_a_time(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["draw", PRESET, "--vary", "structure.form=direct-1,direct-2"]) == 2
    assert "makes 2 realizations" in capsys.readouterr().err


def test_negated_feedback_is_drawn_as_stored(tmp_path: Path) -> None:
    file = tmp_path / "negated.svg"
    assert main(["draw", PRESET, "--vary", "format.feedback=negated", "-o", str(file)]) == 0
    text = file.read_text(encoding="utf-8")
    assert page_of(text).minuses == []
    assert text.count('\N{MINUS SIGN}<tspan font-style="italic">a</tspan>') >= 2
