"""`streamhost draw`."""

from pathlib import Path

import pytest
from drawing_reader import page_of

from streamhost.commands.main import main

PRESET = "rumble-naive-16-bit"


def test_plain_text_by_default(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["draw", PRESET]) == 0
    assert "x[n] --*--[b0>--->(+)-----------*-> y[n]" in capsys.readouterr().out


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
