"""The command line: help without heavy imports, clear refusals, exit statuses, and what commands share."""

import importlib
import io
import json
import subprocess
import sys
import types
from pathlib import Path

import click
import pytest
from hypothesis import given
from hypothesis import strategies as st

from streamhost.commands import common
from streamhost.commands.common import Column, Progress, ledger, presets_named, progress_line, write_json
from streamhost.commands.main import COMMANDS, Entry, main
from streamhost.errors import AudioFileError, MachineError, PresetError

ROOT = Path(__file__).resolve().parent.parent

FLOOD = """
import sys, types, click
from streamhost.commands.main import COMMANDS, Entry, main
@click.command()
def flood():
    for number in range(100_000):
        click.echo(f"line {number}")
module = types.ModuleType("flooding")
module.flood = flood
sys.modules["flooding"] = module
COMMANDS["flood"] = Entry("flooding:flood", "")
sys.exit(main(["flood"]))
"""


@pytest.fixture
def command(monkeypatch):
    """Puts a command named "try" with the given body into the table."""

    def put(body):
        module = types.ModuleType("streamhost_tried")
        module.tried = click.command("try")(body)
        monkeypatch.setitem(sys.modules, "streamhost_tried", module)
        monkeypatch.setitem(COMMANDS, "try", Entry("streamhost_tried:tried", "A trial."))

    return put


def python(code, **how):
    return subprocess.run([sys.executable, "-c", code], cwd=ROOT, capture_output=True, text=True, check=False, **how)


# Help and version


def test_help_imports_nothing_heavy():
    code = (
        "import sys; from streamhost.commands.main import main; status = main(['--help']);"
        "heavy = {'numpy', 'numba', 'scipy', 'soundfile', 'sounddevice', 'msgspec', 'mpmath', 'starlette', 'uvicorn'}"
        "& set(sys.modules);"
        "print(status, sorted(heavy))"
    )
    run = python(code)
    assert run.stderr == ""
    assert run.stdout.splitlines()[-1] == "0 []"


@pytest.mark.parametrize("arguments", [[], ["--help"], ["-h"]])
def test_help_shows_every_command_with_its_line(arguments, capsys):
    assert main(arguments) == 0
    shown = " ".join(capsys.readouterr().out.split())
    for name, entry in COMMANDS.items():
        assert f"{name} {entry.help}" in shown
    assert ("0 done; 1 done, and a limit is not met; 2 the request is wrong; 3 the machine failed us; 130 interrupted; "
            "141 nobody reads the output; 70 a fault of ours.") in shown


def test_version(capsys):
    assert main(["--version"]) == 0
    assert capsys.readouterr().out.startswith("streamhost ")


@pytest.mark.parametrize("name", COMMANDS)
def test_every_command_of_the_table_is_there_and_has_help_of_its_own(name, capsys):
    assert main([name, "--help"]) == 0
    assert capsys.readouterr().out.startswith(f"Usage: streamhost {name} ")


@pytest.mark.parametrize("name", COMMANDS)
def test_a_command_module_imports_nothing_heavy_at_its_top(name):
    module = COMMANDS[name].place.partition(":")[0]
    code = (
        f"import sys, {module};"
        "print(sorted({'numba', 'scipy', 'soundfile', 'sounddevice', 'mpmath'} & set(sys.modules)))"
    )
    run = python(code)
    assert run.stderr == ""
    assert run.stdout == "[]\n"


# What is asked wrongly


@pytest.mark.parametrize(
    ("arguments", "start"),
    [
        (["comprae"], f'streamhost: There is no command "comprae": {", ".join(COMMANDS)}. Did you mean "compare"?'),
        (["xyz"], f'streamhost: There is no command "xyz": {", ".join(COMMANDS)}. (streamhost --help'),
        (["--versoin"], "streamhost: No such option"),
    ],
)
def test_misspelt_commands_and_options_are_refused_with_the_nearest(arguments, start, capsys):
    assert main(arguments) == 2
    out, err = capsys.readouterr()
    assert out == ""
    assert err.startswith(start)
    assert err.count("\n") == 1
    assert err.endswith("(streamhost --help lists what there is.)\n")


def test_a_misspelt_option_of_a_command_is_refused_with_the_nearest(command, capsys):
    @click.option("--input")
    def body(input):
        raise AssertionError("not reached")

    command(body)
    assert main(["try", "--inptu", "x"]) == 2
    err = capsys.readouterr().err
    assert err.startswith("streamhost try: No such option")
    assert "--inptu" in err
    assert "Did you mean" in err
    assert "--input" in err.partition("Did you mean")[2]


# What commands return and raise


@pytest.mark.parametrize(("returned", "status"), [(None, 0), (0, 0), (1, 1)])
def test_a_command_returns_its_exit_status(returned, status, command):
    command(lambda: returned)
    assert main(["try"]) == status


@pytest.mark.parametrize(
    ("error", "status"),
    [
        (AudioFileError("in.wav: there is no such file."), 2),
        (PresetError(["a.toml:1: first.", "a.toml:2: second."]), 2),
        (MachineError("out.wav: the disk is full."), 3),
        (click.UsageError("not so"), 2),
        (click.Abort(), 130),
        (KeyboardInterrupt(), 130),
        (OSError(28, "No space left on device"), 3),
        (MemoryError(), 3),
    ],
    ids=lambda value: type(value).__name__,
)
def test_what_goes_wrong_is_one_paragraph_and_no_traceback(error, status, command, capsys):
    def body():
        raise error

    command(body)
    assert main(["try"]) == status
    out, err = capsys.readouterr()
    assert out == ""
    assert "Traceback" not in err
    expected = {
        130: "Interrupted.\n",
        "OSError": "The machine could not take what was written: No space left on device.\n",
        "MemoryError": "The machine has not enough memory for this.\n",
        "UsageError": "streamhost try: Not so (streamhost try --help lists what there is.)\n",
    }
    assert err == expected.get(status, expected.get(type(error).__name__, f"{error}\n"))


def test_a_fault_of_ours_shows_its_traceback_and_asks_for_a_report(command, capsys):
    def body():
        raise ZeroDivisionError("a fault of ours")

    command(body)
    assert main(["try"]) == 70
    err = capsys.readouterr().err
    assert err.startswith("Traceback")
    assert "ZeroDivisionError: a fault of ours" in err
    assert err.endswith("Please report it with all the lines above.\n")


def test_a_reader_that_leaves_early_is_no_error():
    run = subprocess.Popen(
        [sys.executable, "-c", FLOOD], cwd=ROOT, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True
    )
    assert run.stdout.readline() == "line 0\n"
    run.stdout.close()
    assert run.stderr.read() == ""
    run.stderr.close()
    assert run.wait() == 141


def test_a_full_disk_under_standard_output_is_the_machines_failure():
    if not Path("/dev/full").exists():
        pytest.skip("this machine has no device that is always full")
    with Path("/dev/full").open("w") as full:
        run = subprocess.run(
            [sys.executable, "-c", FLOOD], cwd=ROOT, stdout=full, stderr=subprocess.PIPE, text=True, check=False
        )
    assert run.returncode == 3
    assert run.stderr == "The machine could not take what was written: No space left on device.\n"


def test_a_terminal_without_the_minus_sign_is_shown_a_mark():
    code = (
        "import sys; from streamhost.commands import common; from streamhost.commands.main import main;"
        "main(['--version']); print(common.ledger([common.Column('x')], [[-1]], numbered=False))"
    )
    run = python(code, env={"PYTHONIOENCODING": "ascii", "PATH": ""})
    assert run.stderr == ""
    assert run.stdout.splitlines()[-2:] == ["?1", "??"]


def test_the_shells_are_told_how_to_complete(monkeypatch, capsys):
    monkeypatch.setenv("_STREAMHOST_COMPLETE", "zsh_source")
    assert main([]) == 0
    assert "streamhost" in capsys.readouterr().out


# Presets from the command line


def test_the_mistakes_of_all_presets_are_told_together(tmp_path):
    (tmp_path / "one.toml").write_text("rate = 0\n[[filter]]\nb = [1]\n")
    (tmp_path / "two.toml").write_text("rate = 1\n[[filter]]\nb = []\n")
    with pytest.raises(PresetError) as caught:
        presets_named([str(tmp_path / "one.toml"), str(tmp_path / "two.toml"), "no-such-preset"])
    first, second, third = caught.value.problems
    assert first.startswith(f"{tmp_path / 'one.toml'}:1: rate")
    assert second.startswith(f"{tmp_path / 'two.toml'}:3: b")
    assert third.startswith("no-such-preset: ")


def test_shipped_presets_go_by_their_name_and_are_varied():
    made = presets_named(["rumble-float32"], ["structure.form=direct-1,direct-2"])
    assert [preset.form for preset in made] == ["direct-1", "direct-2"]


# JSON


def test_json_has_null_where_there_is_no_finite_figure(capsys):
    realizations = [{"peak_dbfs": float("-inf"), "frames": 3}, ("é", True, None, -1.5)]
    write_json("-", {"noise_dbfs": float("nan"), "realizations": realizations})
    out = capsys.readouterr().out
    assert json.loads(out) == {
        "noise_dbfs": None, "realizations": [{"peak_dbfs": None, "frames": 3}, ["é", True, None, -1.5]],
    }
    assert "é" in out


def test_a_json_file_that_exists_is_overwritten_only_by_force(tmp_path):
    file = tmp_path / "figures.json"
    write_json(str(file), {"frames": 1})
    with pytest.raises(Exception, match="exists") as caught:
        write_json(str(file), {"frames": 2})
    assert caught.value.exit_status == 2
    assert json.loads(file.read_text()) == {"frames": 1}
    write_json(str(file), {"frames": 2}, force=True)
    assert json.loads(file.read_text()) == {"frames": 2}


def test_the_shared_options(command, capsys):
    seen = []

    @common.force_option
    @common.json_option
    @common.vary_option
    def body(force, json_file, variations):
        seen.append((force, json_file, variations))

    command(body)
    assert main(["try"]) == 0
    assert main(["try", "--force", "--json", "-", "--vary", "filter.q=1,2", "--vary", "rate=8000"]) == 0
    assert seen == [(False, None, ()), (True, "-", ("filter.q=1,2", "rate=8000"))]


# Progress


class Terminal(io.StringIO):
    def isatty(self):
        return True


def test_the_progress_line_of_the_specification():
    assert progress_line("compare", 3, 8, "direct-2 Q1.15", 40.2) == "compare  3 of 8  direct-2 Q1.15   41 s left"
    assert progress_line("compare", 1, 8, "a\x1b[2J", None) == "compare  1 of 8  a\N{REPLACEMENT CHARACTER}[2J"
    assert progress_line("compare", 2, 2, "x", 121) == "compare  2 of 2  x   3 min left"


def ticking(times):
    remaining = iter(times)
    return lambda: next(remaining)


def test_a_terminal_shows_one_line_that_is_rewritten_and_gone_at_the_end(monkeypatch):
    monkeypatch.setenv("COLUMNS", "24")
    terminal = Terminal()
    with Progress("compare", 2, stream=terminal, clock=ticking([0.0, 0.1, 1.1])) as progress:
        progress.step("first")
        progress.step("a long second name")
    assert terminal.getvalue() == "\rcompare  1 of 2  first\x1b[K\rcompare  2 of 2  a long\x1b[K\r\x1b[K"


def test_elsewhere_nothing_is_said_in_the_first_two_seconds_and_then_a_line_for_each_step():
    file = io.StringIO()
    with Progress("compare", 4, stream=file, clock=ticking([0.0, 0.0, 2.0, 3.0, 30.0])) as progress:
        for label in ("first", "second", "third", "fourth"):
            progress.step(label)
    assert file.getvalue() == "compare  3 of 4  third   3 s left\ncompare  4 of 4  fourth   10 s left\n"


# The ledger


def test_a_ledger_has_numerals_first_points_under_each_other_and_units_in_the_head():
    columns = [Column("realization"), Column("noise", "dBFS", 1), Column("saturated"), Column("share")]
    rows = [
        ["direct-1 Q1.15", -33.52, 0, 0.25],
        ["transposed-2", None, 1234, 10.5],
        ["日本 \x1b[31m", float("-inf"), 7, -3],
    ]
    assert ledger(columns, rows).splitlines() == [
        "   realization     noise  saturated  share",
        "                    dBFS",
        "──────────────────────────────────────────",
        "1  direct-1 Q1.15  −33.5          0   0.25",
        "2  transposed-2        –       1234  10.5",
        "3  日本 \N{REPLACEMENT CHARACTER}[31m       −∞            7  −3",
        "──────────────────────────────────────────",
    ]


def test_a_ledger_without_numerals_and_without_rows():
    assert ledger([Column("form"), Column("needs")], [["direct-1", "4 delays"]], numbered=False) == (
        "form      needs\n──────────────────\ndirect-1  4 delays\n──────────────────"
    )
    assert ledger([Column("form"), Column("needs")], [], numbered=False) == "form  needs\n───────────\n───────────"


@pytest.mark.parametrize("value", [-0.0, 0.0, -0.04])
def test_what_rounds_to_nothing_has_no_sign(value):
    assert ledger([Column("x", "", 1)], [[value]], numbered=False).splitlines()[2] == "0.0"


figures_of_all_sizes = st.one_of(st.integers(-(10**6), 10**6), st.floats(-1e6, 1e6, allow_subnormal=False))


@given(st.lists(figures_of_all_sizes, min_size=1, max_size=8))
def test_the_digits_before_the_point_end_in_one_column(values):
    lines = ledger([Column("figure"), Column("after")], [[value, "|"] for value in values]).splitlines()[2:-1]
    figures = [line.split()[1] for line in lines]
    ends = {line.index(figure) + len(figure.partition(".")[0]) for line, figure in zip(lines, figures, strict=True)}
    exponents = any("e" in figure for figure in figures)
    assert len(ends) == 1 or exponents
    assert len({line.index("|") for line in lines}) == 1


def test_the_modules_named_in_the_table_are_the_ones_that_are_imported(command):
    command(lambda: None)
    assert COMMANDS["try"].load() is importlib.import_module("streamhost_tried").tried
