"""How fast `streamhost render` is: a script to be run by hand, since no test is timed.

Ten minutes of stereo 16-bit WAV at 48 kHz through an order-8 float32 cascade, kernel cached, whole process, against a
whole process that copies the file by the audio library in float32 blocks of 4096 frames. The two take turns; printed
are the medians of the seconds on the clock and of the processor, the ratios, and the most memory that was used.

    python tests/benchmarks/render.py [--repeats 5] [--kind sections|butterworth]

To reach: a ratio of at most 2.5, and 300 MB.
"""

import argparse
import os
import statistics
import subprocess
import sys
import tempfile
import time
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import soundfile

MINUTES, RATE, CHANNELS = 10, 48000, 2

COPY = """
import sys, numpy, soundfile
with soundfile.SoundFile(sys.argv[1]) as source:
    with soundfile.SoundFile(sys.argv[2], "w", source.samplerate, source.channels, subtype="PCM_16") as target:
        memory = numpy.empty((4096, source.channels), numpy.float32)
        while len(block := source.read(dtype="float32", out=memory)):
            target.write(block)
"""

PRESET = """
rate = 48000
[[filter]]
{filter}
[structure]
decomposition = "cascade"
[format]
arithmetic = "float32"
"""
BUTTERWORTH = 'kind = "butterworth"\nresponse = "low-pass"\norder = 8\nfrequency = 1000.0'


@dataclass(frozen=True)
class Run:
    """One whole process: seconds on the clock, seconds of the processor, bytes of memory at most."""

    wall: float
    processor: float
    memory: int


def timed(command: list[str]) -> Run:
    """Run a command to its end; only what it uses itself is counted."""
    began = time.perf_counter()
    process = subprocess.Popen(command, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
    _, status, usage = os.wait4(process.pid, 0)
    process.returncode = os.waitstatus_to_exitcode(status)
    if process.returncode != 0:
        sys.exit(f"{' '.join(command[:4])} ... ended with status {process.returncode}")
    return Run(time.perf_counter() - began, usage.ru_utime + usage.ru_stime, usage.ru_maxrss * 1024)


def make_input(path: Path) -> None:
    rng = np.random.default_rng(1)
    with soundfile.SoundFile(path, "w", RATE, CHANNELS, subtype="PCM_16") as file:
        for _ in range(MINUTES * 60):
            file.write(rng.integers(-8000, 8001, (RATE, CHANNELS)).astype(np.int16))


def preset(kind: str) -> str:
    """The filter as four sections, which need no design at start, or as what it is called."""
    if kind == "butterworth":
        return PRESET.format(filter=BUTTERWORTH)
    from scipy import signal

    rows = signal.butter(8, 1000, fs=RATE, output="sos").tolist()
    return PRESET.format(filter="sections = [\n" + "".join(f"    {row},\n" for row in rows) + "]")


def say(name: str, runs: list[Run], against: list[Run]) -> None:
    wall, processor = (statistics.median(getattr(run, what) for run in runs) for what in ("wall", "processor"))
    base = statistics.median(run.wall for run in against), statistics.median(run.processor for run in against)
    memory = max(run.memory for run in runs) / 2**20
    print(f"{name:<8} {wall:6.2f} s ({wall / base[0]:.2f})", end="   ")
    print(f"processor {processor:6.2f} s ({processor / base[1]:.2f})   memory {memory:.0f} MB")


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0] if __doc__ else None)
    parser.add_argument("--repeats", type=int, default=5)
    parser.add_argument("--kind", choices=("sections", "butterworth"), default="sections")
    arguments = parser.parse_args()
    with tempfile.TemporaryDirectory() as folder:
        source, stated = Path(folder) / "in.wav", Path(folder) / "order8.toml"
        make_input(source)
        stated.write_text(preset(arguments.kind))
        copy = [sys.executable, "-c", COPY, str(source), f"{folder}/copy.wav"]
        render = [sys.executable, "-m", "streamhost.commands.main", "render", "--force"]
        render += [str(stated), str(source), f"{folder}/out.wav"]
        timed(render)  # compiles, and keeps what was compiled
        runs = [(timed(copy), timed(render)) for _ in range(arguments.repeats)]
    copies, renders = [run[0] for run in runs], [run[1] for run in runs]
    say("copy", copies, copies)
    say("render", renders, copies)


if __name__ == "__main__":
    main()
