"""`streamhost import`."""

import pytest
from imported_tables import ROWS, SECTIONS

from streamhost.commands.main import main
from streamhost.presets import load_preset, parse_preset

CONTENT = "".join(",".join(map(str, row)) + "\n" for row in ROWS)
NOTES = [
    "columns: b0,b1,b2,a0,a1,a2, the usual order, since the file names none (--columns states another)",
    "feedback: subtracted, found by stability: added, the filter would be unstable",
]


@pytest.fixture
def table(tmp_path):
    file = tmp_path / "hum.csv"
    file.write_text(CONTENT)
    return file


def test_the_preset_goes_to_standard_output_and_what_was_decided_beside_it(table, capsys):
    assert main(["import", str(table), "--rate", "48000"]) == 0
    out, err = capsys.readouterr()
    assert parse_preset(out).filter == SECTIONS
    assert out.splitlines()[:3] == ["# Imported from hum.csv.", *(f"# {note}" for note in NOTES)]
    assert err.splitlines() == ["preset: a filter of order 4 at 48000 Hz", *NOTES]


def test_a_file_holds_the_filter_bit_for_bit(table, tmp_path, capsys):
    preset = tmp_path / "hum.toml"
    assert main(["import", str(table), "--rate", "48000", "-o", str(preset)]) == 0
    out, err = capsys.readouterr()
    assert out.splitlines() == [f"{preset}: a filter of order 4 at 48000 Hz", *NOTES]
    assert err == ""
    assert load_preset(preset).filter == SECTIONS
    assert sorted(file.name for file in tmp_path.iterdir()) == ["hum.csv", "hum.toml"]


def test_a_file_that_exists_is_written_only_by_force(table, tmp_path, capsys):
    preset = tmp_path / "hum.toml"
    preset.write_text("mine")
    command = ["import", str(table), "--rate", "48000", "-o", str(preset)]
    assert main(command) == 2
    assert "this file exists" in capsys.readouterr().err
    assert preset.read_text() == "mine"
    assert main([*command, "--force"]) == 0
    assert load_preset(preset).filter == SECTIONS


def test_the_file_that_is_imported_is_not_overwritten(table, capsys):
    assert main(["import", str(table), "--rate", "48000", "-o", str(table), "--force"]) == 2
    assert "this is the file that is imported. Write the preset to another." in capsys.readouterr().err
    assert table.read_text() == CONTENT


def test_every_option_is_heard(tmp_path, capsys):
    file = tmp_path / "codes.h"
    file.write_text("const int16_t hum[] = {100, 200, 100, 8192, -4096};")
    command = ["import", str(file), "--rate", "44100", "--columns", "b2,b1,b0,a1,a2", "--word", "Q2.14"]
    assert main(command) == 2
    assert "State --feedback subtracted where" in capsys.readouterr().err
    assert main([*command, "--feedback", "added"]) == 0
    found = parse_preset(capsys.readouterr().out).filter
    assert found.rate == 44100
    assert found.codes.word == "Q2.14"
    assert found.codes.rows == ((100, 200, 100, 16384, -8192, 4096),)


def test_what_is_refused_leaves_no_file_and_names_its_place(table, tmp_path, capsys):
    table.write_text("0.5,1,0.5,1,-1.8,x\n")
    assert main(["import", str(table), "--rate", "48000", "-o", str(tmp_path / "hum.toml")]) == 2
    out, err = capsys.readouterr()
    assert out == ""
    assert err == f'{table}: line 1, column 18: "x" is no number. Decimals have a point: 0.5.\n'
    assert [file.name for file in tmp_path.iterdir()] == ["hum.csv"]


@pytest.mark.parametrize(
    ("arguments", "said"),
    [([], "Missing option '--rate'"), (["--rate", "0"], "a sample rate is a number of hertz above 0"),
     (["--rate", "nan"], "rate is nan, which is not finite"),
     (["--rate", "48000", "--feedback", "minus"], "'minus' is not one of")],
)
def test_wrong_options(arguments, said, table, capsys):
    assert main(["import", str(table), *arguments]) == 2
    assert said in capsys.readouterr().err
