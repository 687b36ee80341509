"""`--report`: the folder, whole or not at all, and what lies in it."""

import json
import re

import numpy as np
import pytest
from report_examples import LIMITS, compared, preset

from streamhost.commands.main import main
from streamhost.commands.report_compare import write_compared
from streamhost.errors import RequestError
from streamhost.files import read_all
from streamhost.files.folder import atomic_folder


def test_the_folder_holds_the_page_its_figures_and_its_audio(report) -> None:
    assert sorted(path.name for path in report.iterdir()) == ["audio", "figures.json", "index.html"]
    text = (report / "index.html").read_text(encoding="utf-8")
    assert "One of two meets every limit: 1; 2, not asked, would miss one or more." in text
    assert f"--report {report}" in text
    players = re.findall(r'<audio controls preload="none" src="([^"]*)"', text)
    assert len(players) == 4 and all((report / player).is_file() for player in players)
    assert sorted(players) == sorted(f"audio/{path.name}" for path in (report / "audio").iterdir())


def test_the_page_tells_the_figures_of_the_json(report) -> None:
    figures = json.loads((report / "figures.json").read_text(encoding="utf-8"))["realizations"]
    text = (report / "index.html").read_text(encoding="utf-8")
    for one in figures:
        assert f"{one['noise_dbfs']:.1f}".replace("-", "−") in text
        assert one["noise"]["measured_dbfs"] == one["noise_dbfs"]
        assert {"response", "overflow"} <= one.keys()
    assert figures[0]["output"] is None  # a place that no longer is


def test_a_difference_is_raised_by_what_its_player_says(report) -> None:
    """To a peak of -12 dBFS or just below."""
    text = (report / "index.html").read_text(encoding="utf-8")
    raised = re.findall(r"<span>Difference, raised by (\d+) dB</span>", text)
    figures = json.loads((report / "figures.json").read_text(encoding="utf-8"))["realizations"]
    assert [int(gain) for gain in raised] == [one["difference_gain_db"] for one in figures]
    for name in ("1-first", "2-second"):
        samples, _ = read_all(report / "audio" / f"{name}-difference.wav")
        assert -13.01 < 20.0 * np.log10(np.abs(samples).max()) <= -11.99


def test_a_run_that_is_broken_off_leaves_nothing(tmp_path, monkeypatch) -> None:
    def broken(*arguments):
        raise KeyboardInterrupt

    monkeypatch.setattr("streamhost.commands.report_compare.write_compared", broken)
    compared(tmp_path, status=130)
    assert sorted(path.name for path in tmp_path.iterdir()) == ["first.toml", "noise.wav", "second.toml"]
    assert write_compared is not broken


def test_a_folder_that_exists_is_replaced_only_when_that_is_asked_for(tmp_path, capsys) -> None:
    """And never one that holds anything else."""
    folder = tmp_path / "report"
    folder.mkdir()
    compared(tmp_path, status=2)
    assert "replace it with --force" in capsys.readouterr().err
    (folder / "mine.txt").write_text("mine", encoding="utf-8")
    measure = ["measure", str(tmp_path / "first.toml"), "--only", "response,overflow", "--report", str(folder), "--force"]
    assert main(measure) == 2
    assert "holds other files" in capsys.readouterr().err
    assert (folder / "mine.txt").read_text(encoding="utf-8") == "mine"
    (folder / "mine.txt").unlink()
    assert main(measure) == 0
    assert main(measure) == 0
    assert {path.name for path in folder.iterdir()} >= {"index.html", "figures.json"}
    text = (folder / "index.html").read_text(encoding="utf-8")
    assert "meets its limit." in text and "<h2>Overflow</h2>" in text
    assert sorted(path.name for path in tmp_path.iterdir()) == ["first.toml", "noise.wav", "report", "second.toml"]


def test_a_miss_exits_with_1_and_stands_in_the_page(tmp_path) -> None:
    file = preset(tmp_path, "quiet", title="Too loud", limits=LIMITS.format(noise=-140.0))
    assert main(["measure", file, "--only", "noise", "--report", str(tmp_path / "report")]) == 1
    text = (tmp_path / "report" / "index.html").read_text(encoding="utf-8")
    assert "Too loud misses its limit." in text and "at most −140" in text


def test_a_folder_appears_whole_or_not_at_all(tmp_path) -> None:
    target = tmp_path / "new"
    with pytest.raises(ValueError, match="on the way"), atomic_folder(target, lambda path: True) as folder:
        (folder / "half").write_text("half", encoding="utf-8")
        assert not target.exists()
        raise ValueError("on the way")
    assert list(tmp_path.iterdir()) == []
    for word in ("one", "two"):
        with atomic_folder(target, lambda path: True, overwrite=True) as folder:
            (folder / word).write_text(word, encoding="utf-8")
    assert [path.name for path in target.iterdir()] == ["two"] and [path.name for path in tmp_path.iterdir()] == ["new"]
    with pytest.raises(RequestError, match="does not exist"), atomic_folder(tmp_path / "no" / "new", lambda path: True):
        pass
