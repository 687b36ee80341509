"""Small reports: a comparison of two realizations as the command line makes it, and contents made by hand."""

from pathlib import Path
from typing import Any

import pytest

from streamhost.commands import instruments
from streamhost.commands.main import main
from streamhost.files import AudioWriter
from streamhost.measure import Verdict
from streamhost.report import Contents, Lane
from streamhost.signals import white

RATE = 8000
EVIL = 'Peak </script><script>document.title = "taken"</script><img src=x onerror=alert(1)> & "quoted"'
PRESET = """
title = '{title}'
rate = 8000

[[filter]]
kind = "peak"
frequency = 1000.0
gain_db = 6.0
q = 2.0

[structure]
form = "{form}"

[format]
signal = "{signal}"
"""
LIMITS = """
[limits]
noise_dbfs = {noise}
response_deviation_db = 0.1
"""


def preset(
    folder: Path, name: str, *, title: str = EVIL, form: str = "direct-1", signal: str = "Q1.15", limits: str = ""
) -> str:
    path = folder / f"{name}.toml"
    path.write_text(PRESET.format(title=title, form=form, signal=signal) + limits, encoding="utf-8")
    return str(path)


def recording(folder: Path) -> str:
    """A second of noise."""
    with AudioWriter(folder / "noise.wav", rate=RATE, channels=1, subtype="pcm24") as writer:
        writer.write(white(RATE, 1, seed=3, peak_dbfs=-20.0))
    return str(folder / "noise.wav")


def quick(patch: pytest.MonkeyPatch) -> None:
    """Only the instruments that take little time."""
    few = tuple(each for each in instruments.INSTRUMENTS if each.name in ("response", "noise", "overflow"))
    for module in ("instruments", "report_compare", "report_measure", "reporting", "measure_run", "measure_text"):
        patch.setattr(f"streamhost.commands.{module}.INSTRUMENTS", few)


def compared(folder: Path, *more: str, status: int = 0) -> Path:
    """The folder of a report: the first meets its limits, the second states none and would miss them."""
    first = preset(folder, "first", limits=LIMITS.format(noise=-80.0))
    second = preset(folder, "second", title="Short word", signal="Q1.7", form="direct-2")
    report = folder / "report"
    assert main(["compare", first, second, "--input", recording(folder), "--report", str(report), *more]) == status
    return report


def verdict(found: float | None, allowed: float = -92.0, key: str = "noise_dbfs", **more: Any) -> Verdict:
    return Verdict(key, found, allowed, "dBFS", **more)


def lane(number: int, *verdicts: Verdict, states: bool = True, **results: Any) -> Lane:
    """A realization without sound and drawing."""
    return Lane(number=number, title=f"Filter {number}", form="direct-1 · cascade · Q1.15", short=f"form {number}",
                states_limits=states and bool(verdicts), verdicts=verdicts, results=results, facts=(), drawing="", counts="")


def contents(*lanes: Lane, **more: Any) -> Contents:
    return Contents(**{
        "heading": "Filters, compared", "lanes": lanes, "source": "noise.wav", "command": "streamhost compare", "version": "0",
        "rate": 48000.0, "band": (20.0, 20000.0), "limit_signal": "noise", **more})
