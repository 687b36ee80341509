"""Structures of the user's own: taken up, run, drawn, measured; mistakes are told with the user's line."""

import json
import re
import signal
import subprocess
import sys
import time
from pathlib import Path

import numpy as np
import pytest

from streamhost import Filter, design, realize
from streamhost.commands.main import main
from streamhost.errors import RequestError, StreamhostError, StructureError
from streamhost.structures import build, form, forms, load_structures
from streamhost.structures.forms import FORMS

ROOT = Path(__file__).parent.parent


def in_readme(language: str) -> str:
    """The form, or the preset, that the README shows."""
    text = (ROOT / "README.md").read_text(encoding="utf-8").partition("## A structure of your own")[2]
    return re.search(rf"```{language}\n(.*?)```", text, re.DOTALL)[1]


PRESET = in_readme("toml")
PLAIN = """
from streamhost import Form

def build_section(draft, x):
{body}

FORM = Form(name="mine", summary="mine", begins_with="numerator", build_section=build_section)
"""


@pytest.fixture(autouse=True)
def only_shipped_forms_stay():
    before = dict(FORMS)
    yield
    FORMS.clear()
    FORMS.update(before)


def written(folder: Path, body: str, name: str = "mine.py") -> Path:
    path = folder / name
    path.write_text(PLAIN.format(body="\n".join(f"    {line}" for line in body.splitlines())))
    return path


def test_the_readmes_structure_is_compared_beside_the_shipped_one(tmp_path, capsys, monkeypatch) -> None:
    monkeypatch.chdir(tmp_path)
    Path("offset.py").write_text(in_readme("python"))
    Path("cut.toml").write_text(PRESET)
    text = (ROOT / "README.md").read_text(encoding="utf-8")
    shown = re.findall(r"^streamhost ((?:forms|compare) .*offset\.py.*)$", text, re.MULTILINE)
    assert len(shown) == 2
    assert main(shown[0].split()) == 0
    assert "[e0>" in capsys.readouterr().out
    assert main([*shown[1].split(), "--json", "table.json"]) == 0
    direct, offset = json.loads(Path("table.json").read_text())["realizations"]
    said = re.search(r"off by ([\d.]+) dB in direct-1 and by ([\d.]+) dB in this form, .+ noise of −([\d.]+) dBFS", text)
    deviations = [direct["response_deviation_db"], offset["response_deviation_db"]]
    assert deviations == pytest.approx([float(said[1]), float(said[2])], abs=0.0005)
    assert [lane["noise_predicted_dbfs"] for lane in (direct, offset)] == pytest.approx([-float(said[3])] * 2, abs=0.05)
    assert [lane["multiplications"] for lane in (direct, offset)] == [5, 5]
    assert offset["additions"] == direct["additions"] + 5


def test_the_readmes_structure_is_the_filter(tmp_path) -> None:
    (tmp_path / "offset.py").write_text(in_readme("python"))
    assert load_structures(tmp_path / "offset.py") == ("offset",)
    filter = design("elliptic", rate=48000, response="low-pass", order=5, frequency=5000, ripple_db=1, stopband_db=40)
    x = np.random.default_rng(0).uniform(-1, 1, 500)
    theirs, ours = (realize(filter, form=form).process(x) for form in ("direct-1", "offset"))
    # Other roundings: ten operations a section and frame, each of values of at most 8, behind poles of a gain below 100.
    np.testing.assert_allclose(ours, theirs, rtol=0, atol=10 * 8 * 100 * 2.0**-53)
    with pytest.raises(StructureError, match=r'"offset" cannot carry the filter: it has order 5, .+ direct-1'):
        build(filter, form="offset", decomposition="whole")


def test_a_file_loaded_again_replaces_its_forms(tmp_path) -> None:
    body = "return draft.gain('g', 0.5, x)"
    path = written(tmp_path, body)
    load_structures(path)
    first = form("mine")
    written(tmp_path, body.replace("0.5", "0.25"))
    load_structures(path)
    assert form("mine") is not first
    other = written(tmp_path, body, "other.py")
    with pytest.raises(StructureError, match=r'other\.py: the name "mine" is taken'):
        load_structures(other)
    assert "mine" in forms()


MISTAKES = [
    ("undriven delay", "d = draft.delay('d')\nreturn draft.add('y', [x, d])", 5, "nothing drives"),
    ("dead end", "d = draft.delay('d', x)\ns = draft.builder.sum(x, d, label='s')\nreturn x", 5, "reaches no output"),
    ("loop by a delay of 0", "d = draft.delay('d', n=0)\ns = draft.add('s', [x, d])\nd.takes(s)\nreturn s", 5,
     "a delay is 1 or more"),
    ("missing output", "draft.gain('g', 0.5, x)", 4, "returned None. It is to return the node"),
    ("failing builder", "n = 1\nreturn draft.gain('g', 1 / (n - 1), x)", 6, "ZeroDivisionError"),
    ("our refusal", "return draft.gain('g', float('nan'), x)", 5, "not a finite number"),
]


@pytest.mark.parametrize(("body", "line", "said"), [case[1:] for case in MISTAKES], ids=[case[0] for case in MISTAKES])
def test_a_mistake_is_told_with_its_line(tmp_path, body: str, line: int, said: str) -> None:
    path = written(tmp_path, body)
    load_structures(path)
    with pytest.raises(StreamhostError, match=said) as error:
        build(Filter.from_coefficients([1.0], rate=48000), form="mine")
    assert f"mine.py, line {line}" in str(error.value)


GUARDED = [
    ("general that fails", "general=lambda section: 1 / 0", "ZeroDivisionError: division by zero"),
    ("general that is none", "general=lambda section: 3", "general of form \"mine\" returned 3. It is to return a General"),
    ("hazards of None", "hazards=lambda ratio: None", "hazards of form \"mine\" returned None. It is to return a tuple"),
    ("hazards of a text", "hazards=lambda ratio: 'beware'", "returned 'beware'. It is to return a tuple of sentences"),
    ("carries of a truth", "carries=lambda ratio: True", "carries of form \"mine\" returned True. It is to return a string"),
    ("size of numbers", "size=lambda section: (4, 2)", "size of form \"mine\" returned (4, 2). It is to return a Size"),
    ("end of the process", "hazards=lambda ratio: exit(4)", "SystemExit: 4"),
]


@pytest.mark.parametrize(("what", "said"), [case[1:] for case in GUARDED], ids=[case[0] for case in GUARDED])
def test_every_function_of_a_form_is_guarded(tmp_path, what: str, said: str) -> None:
    path = written(tmp_path, "return draft.gain('g', 0.5, x)")
    text = path.read_text().replace("build_section=build_section)", f"build_section=build_section,\n            {what})")
    path.write_text(text)
    load_structures(path)
    with pytest.raises(StructureError, match=re.escape(said)) as error:
        build(Filter.from_coefficients([1.0], rate=48000), form="mine")
    assert re.search(r"mine\.py, line [78]: ", str(error.value))


def test_the_end_of_the_process_is_the_files_mistake(tmp_path, capsys) -> None:
    path = tmp_path / "mine.py"
    path.write_text("import sys\nsys.exit(4)\n")
    assert main(["forms", "--structures", str(path)]) == 2
    assert "mine.py, line 2: SystemExit: 4" in capsys.readouterr().err


FILES = [
    ("syntax", "def build(:\n", StructureError, r"mine\.py, line 1: invalid syntax"),
    ("byte 0", "\nx = '\0'\n", StructureError, r"mine\.py, line 2: a character of value 0"),
    ("end of the process", "\nraise SystemExit(4)\n", StructureError, r"mine\.py, line 2: SystemExit: 4"),
    ("failing import", "\nimport no_such_module\n", StructureError, r"mine\.py, line 2: ModuleNotFoundError"),
    ("nothing declared", "x = 1\n", StructureError, r"declares no form"),
    ("no list", "FORMS = 3\n", StructureError, r"FORMS is a int"),
    ("no form", "FORMS = [3]\n", StructureError, r"a int is declared as a form"),
    ("bad name", "from streamhost import Form\nFORM = Form('My Form', '', 'numerator', None)\n", StructureError,
     "small letters"),
    ("taken", "from streamhost import Form\nFORM = Form('direct-1', '', 'numerator', None)\n", StructureError,
     r'the name "direct-1" is taken'),
    ("bad half", "from streamhost import Form\nFORM = Form('mine', '', 'middle', None)\n", StructureError,
     "begins_with 'middle'"),
]  # fmt: skip


@pytest.mark.parametrize(("text", "kind", "said"), [case[1:] for case in FILES], ids=[case[0] for case in FILES])
def test_a_file_that_cannot_be_is_refused(tmp_path, text: str, kind: type[Exception], said: str) -> None:
    path = tmp_path / "mine.py"
    path.write_text(text)
    before = forms()
    with pytest.raises(kind, match=said):
        load_structures(path)
    assert forms() == before


def test_a_file_that_is_none_is_refused(tmp_path, capsys) -> None:
    for place in (tmp_path / "none.py", tmp_path):
        with pytest.raises(RequestError, match="--structures takes a Python file"):
            load_structures(place)
    (tmp_path / "binary.py").write_bytes(b"\xff\xfe\x00")
    with pytest.raises(RequestError, match="no text in UTF-8"):
        load_structures(tmp_path / "binary.py")
    assert main(["forms", "--structures", str(tmp_path / "none.py")]) == 2
    assert "there is no such file" in capsys.readouterr().err


def test_a_preset_never_runs_a_file(tmp_path, capsys) -> None:
    ran = tmp_path / "ran"
    (tmp_path / "evil.py").write_text(f"open({str(ran)!r}, 'w')\n")
    preset = tmp_path / "evil.toml"
    preset.write_text(PRESET.replace('form = "direct-1"', f'form = "direct-1"\nstructures = {str(tmp_path / "evil.py")!r}'))
    assert main(["draw", str(preset)]) == 2
    assert not ran.exists()


def test_a_builder_that_runs_for_ever_is_interrupted(tmp_path) -> None:
    path = written(tmp_path, "import time\nprint('running', flush=True)\nwhile True:\n    time.sleep(0.01)")
    preset = tmp_path / "p.toml"
    preset.write_text(PRESET.replace("direct-1", "mine"))
    command = [sys.executable, "-m", "streamhost.commands.main", "draw", str(preset), "--structures", str(path)]
    process = subprocess.Popen(command, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True)
    assert process.stdout.readline() == "running\n"
    time.sleep(0.1)
    process.send_signal(signal.SIGINT)
    assert process.communicate(timeout=20)[1] == "Interrupted.\n"
    assert process.returncode == 130


def test_an_installed_package_declares_forms(tmp_path, monkeypatch) -> None:
    package = tmp_path / "strange_forms-1.0.dist-info"
    package.mkdir()
    (package / "METADATA").write_text("Metadata-Version: 2.1\nName: strange-forms\nVersion: 1.0\n")
    (package / "entry_points.txt").write_text("[streamhost.forms]\nmine = strange_forms:FORM\n")
    (tmp_path / "strange_forms.py").write_text(PLAIN.format(body="    return draft.gain('g', 0.5, x)"))
    monkeypatch.syspath_prepend(str(tmp_path))
    from streamhost.structures.own import load_installed

    assert load_installed() == ("mine",)
    built = build(Filter.from_coefficients([0.5], rate=48000), form="mine")
    assert [node.label for node in built.diagram.nodes] == ["x", "g", "y"]
