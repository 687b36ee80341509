"""Long words measured and rendered: what is predicted is found, and what a sample cannot hold is refused in one sentence."""

from pathlib import Path
from typing import Any

import numpy as np
import pytest

from streamhost import Fixed, load_preset, realize
from streamhost.commands.main import main
from streamhost.files import AudioWriter
from streamhost.measure import limit_band, limit_signal, measure
from streamhost.shipped import folder

RUMBLE = load_preset(folder("preset") / "rumble-naive-24-bit.toml")


@pytest.mark.parametrize(("keys", "ideal"), [
    ({"arithmetic": "48x24+56"}, "float64"),
    ({"signal": "Q1.31", "state": "Q1.63", "operand": "Q1.63", "coefficients": "Q2.30"}, "float64"),
    ({"signal": "Q1.52", "state": "Q1.63", "operand": "Q1.63", "coefficients": "Q2.30"}, "double-double"),
])
def test_the_rumble_filter_in_double_length_is_as_quiet_as_predicted(keys: dict[str, Any], ideal: str) -> None:
    """On the noise by which limits are checked, of which poles near z = 1 make sums thousands of steps long."""
    realization = realize(RUMBLE.filter, form="direct-1", format=Fixed(**keys))
    found = measure(realization, limit_signal(RUMBLE.rate), limit_band(RUMBLE.limits, RUMBLE.rate))
    assert found.ideal == ideal
    assert found.noise.dbfs == pytest.approx(found.prediction.dbfs, abs=max(0.5, found.noise.interval_db))
    if ideal == "float64":
        # What is left is the rounding of the output, a step squared over 12 (Bennett 1948), by 3.01 dB a sine's level.
        # The poles raise the state's errors by 69 dB, and its bits lower them by 144 and more.
        step = 2.0 ** -realization.format.output.word.fraction
        assert found.noise.full_dbfs == pytest.approx(10 * np.log10(step**2 / 12 * 2), abs=0.1)


def test_words_that_no_sample_holds_are_refused_before_anything_is_written(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    preset, given, out = (str(tmp_path / name) for name in ("long.toml", "in.wav", "out.wav"))
    text = (folder("preset") / "rumble-naive-24-bit.toml").read_text(encoding="utf-8")
    format = 'signal = "Q1.63"\ninput = "Q1.31"\ncoefficients = "Q2.30"'
    Path(preset).write_text(text.replace('arithmetic = "24x24+56"', format), encoding="utf-8")
    with AudioWriter(given, rate=48000, channels=1, subtype="pcm16") as writer:
        writer.write(np.zeros((100, 1)))
    for command in (["render", preset, given, out], ["compare", preset, "--input", given, "--output", out]):
        assert main(command) == 2
        assert capsys.readouterr() == ("", f"""\
{preset} has output = Q1.63, 64 bits: samples are float64, which holds 53 bits, and longer words come in and go out as \
codes only (process_codes). State a shorter one, for instance "Q1.31", for what comes in and what goes out; signal, state \
and operand stay as long as they are.
""")
    assert sorted(file.name for file in tmp_path.iterdir()) == ["in.wav", "long.toml"]
