"""What a comparison says in words."""

import pytest

from streamhost.commands.compare_text import short_title
from streamhost.commands.main import main
from streamhost.commands.verdict_text import miss
from streamhost.files import AudioWriter
from streamhost.measure import Verdict
from streamhost.presets import parse_preset, vary
from streamhost.signals import white

RATE = 48000
TEXT = 'title = "{title}"\nrate = 48000\n[[filter]]\nkind = "peak"\nfrequency = 1000\ngain_db = 6\nq = 1\n'


@pytest.mark.parametrize(("found", "allowed", "said"), [
    (-80.998, -92.0, "−81.0, at most −92 dBFS"), (-80.998, -92.5, "−81.00, at most −92.5 dBFS"),
    (0.12345, 0.1, "0.12, at most 0.1 dBFS"), (-91.98, -92.0, "−91.98, at most −92 dBFS"),
    (0.100004, 0.1, "0.100004, at most 0.1 dBFS"), (3e-7, 1e-9, "0.0000003, at most 1e−09 dBFS"),
])
def test_a_miss_shows_no_more_decimals_than_tell(found, allowed, said):
    assert miss(Verdict("noise_dbfs", found, allowed, "dBFS")) == f"noise_dbfs: {said}"


def test_what_runs_away_slowly_is_told(tmp_path, capsys):
    """Order 8 at 20 Hz undivided: float64's rounding of its coefficients puts poles outside the circle."""
    path, noise = tmp_path / "slow.toml", tmp_path / "noise.wav"
    path.write_text('rate = 48000\n[[filter]]\nkind = "butterworth"\nresponse = "low-pass"\norder = 8\nfrequency = 20.0\n'
                    '[structure]\ndecomposition = "whole"\nform = "transposed-2"\n', encoding="utf-8")
    with AudioWriter(noise, rate=RATE, channels=1, subtype="pcm24") as writer:
        writer.write(white(RATE, 1, 5, -20.0))
    assert main(["compare", str(path), "--input", str(noise), "--output", str(tmp_path / "out")]) == 0
    captured = capsys.readouterr()
    assert "1 has no noise figure: the output or the ideal runs away" in captured.out
    assert "no difference written: it ran away" in captured.out
    assert "Warning" not in captured.err


@pytest.mark.parametrize(("title", "variations", "shown"), [
    ("Peak", [], "Peak"),
    ("Peak", ["filter.q=2"], "Peak, q 2"),
    ("x" * 57, [], "x" * 55 + "…"),
    ("x" * 56, ["filter.q=2"], "x" * 50 + "…, q 2"),
    ("x" * 51, ["filter.q=2"], "x" * 51 + ", q 2"),
    ("A longer title", ["filter.frequency=1234.56789012", "filter.gain_db=-6.12345678901", "filter.q=0.123456789012"],
     "A longe…, frequency 1234.56789012, gain_db -6.12345678901, q 0.123456789012"),
])
def test_a_title_is_shortened_in_its_own_part(title, variations, shown):
    (preset,) = vary([parse_preset(TEXT.format(title=title))], variations)
    assert short_title(preset) == shown
