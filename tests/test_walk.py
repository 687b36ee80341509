"""The job in ten minutes, as README tells it: every command runs, and prints what is shown there."""

import json
import re
import shlex
from pathlib import Path

import pytest

from streamhost.commands.main import main

README = Path(__file__).resolve().parent.parent / "README.md"
WALK = re.search(r"^## The job in ten minutes$.*?(?=^## )", README.read_text(encoding="utf-8"), re.MULTILINE | re.DOTALL)[0]
STEPS = {match[1]: match[0] for match in re.finditer(r"^\*+([^*]+)\*+.*?(?=^\*|\Z)", WALK, re.MULTILINE | re.DOTALL)}
# A fenced block with its language, or a row of a table that is not its head.
PARTS = re.compile(
    r"^```(?P<language>\w*)\n(?P<body>.*?)^```$|^\| (?!realization)(?P<row>[a-z][^\n]*) \|$", re.MULTILINE | re.DOTALL
)
FILES = re.compile(r"into `([\w.]+)`:")


class Reader:
    """Someone who types what stands there, in a folder of their own."""

    def __init__(self, capsys):
        self.capsys, self.shown, self.rows = capsys, "", []

    def sh(self, body):
        for line in body.splitlines():
            program, *arguments = shlex.split(line)
            assert program == "streamhost"
            compares = arguments[0] == "compare"
            assert main([*arguments, *(["--json", "figures.json", "--force"] if compares else [])]) == 0
            if compares:
                self.rows += rows(json.loads(Path("figures.json").read_text()))
        self.shown = self.capsys.readouterr().out

    def python(self, body):
        exec(compile(body, "README.md", "exec"), {})
        self.shown = self.capsys.readouterr().out

    def output(self, body):
        assert self.shown.startswith(body) or f"\n{body}" in self.shown

    def row(self, cells):
        found, (name, noise, response, overflows, mean, multiply, words) = self.rows.pop(0), cells
        assert name in (found["preset"], f"{found['form']}, {found['format']}", f"{found['preset']}, {found.get('name')}")
        # Figures are shown with as many digits; the last may turn where a sum is made in another order.
        assert number(noise) == pytest.approx(found["noise_dbfs"], abs=0.1)
        assert number(response) == pytest.approx(found["response_deviation_db"], abs=0.01)
        assert int(overflows) == found["saturations"] + found["wraps"] + found["accumulator_overflows"]
        assert number(mean) == pytest.approx(found["dc_lsb"], abs=1)
        assert (int(multiply), int(words)) == (found["multiplications"], found["delays"])


def rows(document):
    """One for each output."""
    return [one | output for one in document["realizations"] for output in one.get("outputs", [{}])]


def number(shown):
    return None if shown == "–" else float(shown.replace("−", "-"))


def test_the_walk_has_its_steps():
    assert [title.split(",")[0].rstrip(".") for title in STEPS] == [
        "Type an equation", "Import a table of sections", "Decide each block of the loudspeaker", "Hum notch", "Bass shelf",
        "Loudness equalizer", "Level smoother", "Two-way crossover", "Treble FIR", "A-weighting meter",
    ]  # fmt: skip


LONG = ("Loudness equalizer", "A-weighting meter", "Treble FIR", "Bass shelf", "Level smoother")
"""Steps of many or long realizations, each of the same kind as the hum notch: half a minute of work."""


@pytest.mark.parametrize("title", [pytest.param(step, marks=pytest.mark.slow if step in LONG else ()) for step in STEPS])
def test_a_step_of_the_walk(title, tmp_path, monkeypatch, capsys):
    monkeypatch.chdir(tmp_path)
    reader = Reader(capsys)
    files = FILES.findall(STEPS[title])
    for part in PARTS.finditer(STEPS[title]):
        language, body, row = part["language"], part["body"], part["row"]
        if row is not None:
            reader.row(row.split(" | "))
        elif language in ("toml", "csv"):
            Path(files.pop(0)).write_text(body, encoding="utf-8")
        else:
            {"sh": reader.sh, "python": reader.python, "": reader.output}[language](body)
    assert files == reader.rows == []
