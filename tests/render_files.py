"""What the tests of `streamhost render` share: a preset, an input file, and what has to come out."""

from pathlib import Path

import numpy as np
from audio_files import write

from streamhost.files import read_all
from streamhost.presets import load_preset
from streamhost.presets.realizing import realize_preset

PRESET = """
rate = 48000
[[filter]]
{filter}
[structure]
form = "direct-1"
[format]
{format}
"""
PEAK = 'kind = "peak"\nfrequency = 1000\ngain_db = 6\nq = 0.7'
CROSSOVER = 'kind = "linkwitz-riley"\norder = 4\nfrequency = 1000'
FIXED = 'signal = "Q1.15"\ncoefficients = "Q2.14"'


def preset(folder: Path, format: str, filter: str = PEAK) -> str:
    path = folder / "preset.toml"
    path.write_text(PRESET.format(filter=filter, format=format))
    return str(path)


def source(folder: Path, frames: int = 20000, channels: int = 2, peak: float = 0.4, name: str = "in.wav") -> str:
    """More frames than a block, and the last block not full."""
    write(folder / name, np.random.default_rng(7).uniform(-peak, peak, (frames, channels)))
    return str(folder / name)


def expected(stated: str, given: str) -> np.ndarray:
    """What the realization makes of the whole file at once."""
    return realize_preset(load_preset(stated)).process(read_all(given)[0])
