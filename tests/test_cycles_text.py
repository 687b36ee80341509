"""What `measure` says of limit cycles, and the files that it writes."""

import json
import subprocess
import sys

from streamhost.commands.main import main

ONE_POLE = """
rate = 48000
[[filter]]
b = [1.0]
a = [1.0, -0.875]
[format]
signal = "Q1.15"
coefficients = "Q2.14"
rounding = "half-away"
"""


def test_the_command_tells_the_proof_and_writes_a_certificate_that_holds(tmp_path, capsys):
    """Of y = x + 7/8 y the dead band is 4 (Jackson 1969), and the step from rest to x = 1 stays 4 short of 8."""
    preset, folder, figures = (str(tmp_path / name) for name in ("pole.toml", "out", "figures.json"))
    (tmp_path / "pole.toml").write_text(ONE_POLE, encoding="utf-8")
    command = ["measure", preset, "--only", "limit_cycles", "--quick", "--output", folder, "--json", figures]
    assert main(command) == 0
    said = capsys.readouterr().out
    assert "At the output, proven: 4 LSB at most." in said
    assert "an estimate for one rounding to the nearest, and no guarantee" in said
    found = json.loads((tmp_path / "figures.json").read_text(encoding="utf-8"))["limit_cycles"]
    assert (found["proven_lsb"], found["found_lsb"], found["sections"][0]["estimated_dead_band_lsb"]) == (4, 4, 4)
    assert found["stall_lsb"] == 4.0
    paths = {path.name.removeprefix("pole-limit_cycles-"): path for path in (tmp_path / "out").iterdir()}
    assert set(paths) == {"worst.wav", "certificate.json", "recheck.py"}
    check = [sys.executable, "-I", str(paths["recheck.py"]), str(paths["certificate.json"])]
    assert subprocess.run(check, capture_output=True, text=True).stdout == "section 1: holds; its box was walked\n"
