"""The files of a comparison: their names, and what is written into them."""

import re
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from types import TracebackType
from typing import Self

import click
import numpy as np
from numpy.typing import NDArray

from streamhost.commands.common import check_folder, check_new, make_folder
from streamhost.errors import RequestError
from streamhost.files import AudioInfo, AudioWriter
from streamhost.files.atomic import identity
from streamhost.host.rendering import default_subtype
from streamhost.measure.levels import has_run_away
from streamhost.presets import Preset
from streamhost.realization import Realization

LONGEST_VARIED = 80
"""Characters in a file name that say what was varied; the number in front tells files apart in any case."""


@dataclass(frozen=True)
class Pair:
    """Where an output and its difference go."""

    output: Path
    difference: Path


@dataclass(frozen=True)
class Destination:
    """Where the files of one realization go, a pair for each output."""

    folder: Path
    files: tuple[Pair, ...]


def destinations(
    folder: str | None, presets: Sequence[Preset], outputs: Sequence[str], info: AudioInfo, *, force: bool
) -> list[Destination] | list[None]:
    """The files of each preset: its number in the comparison, its name, what was varied, and the name of the output where
    there are several. No folder, no files.

    RequestError where the folder cannot be one or holds one of the files, unless `force`.
    """
    if folder is None:
        return [None] * len(presets)
    place = Path(folder)
    check_folder(place)
    digits = len(str(len(presets)))
    found = []
    for number, preset in enumerate(presets, 1):
        name = f"{number:0{digits}}-{preset.path.stem if preset.path else 'preset'}{_varied(preset)}"
        names = [f"{name}-{output}" for output in outputs] if len(outputs) > 1 else [name]
        files = tuple(Pair(place / f"{each}.wav", place / f"{each}-difference.wav") for each in names)
        found.append(Destination(place, files))
    for pair in (pair for destination in found for pair in destination.files):
        check_new(pair.output, info.path, force=force)
        check_new(pair.difference, info.path, force=force)
    return found


def _varied(preset: Preset) -> str:
    """What was varied, each value behind a hyphen, in characters that any disk takes."""
    values = [re.sub(r"[^A-Za-z0-9.+_-]+", "-", value).strip("-.") for value in preset.source.varied]
    return "".join(f"-{value}" for value in values if value)[:LONGEST_VARIED].rstrip("-.")


@contextmanager
def output_folder(places: Sequence[Destination | None]) -> Iterator[None]:
    """The folder for a run's files, made where it is not there. When the run is broken off, a folder that was made and is
    empty goes; of files that were written it is said that they stay."""
    outputs = [pair.output for place in places if place is not None for pair in place.files]
    if not outputs:
        yield
        return
    folder = outputs[0].parent
    new, before = not folder.exists(), [identity(output) for output in outputs]
    make_folder(folder)
    try:
        yield
    except BaseException:
        if new and not any(folder.iterdir()):
            folder.rmdir()
        elif any(identity(output) not in (None, was) for output, was in zip(outputs, before, strict=True)):
            click.echo(f"{folder}: the files of the realizations that were done stay there.", err=True)
        raise


class OutputFile(AudioWriter):
    """What a realization puts out: PCM that holds it exactly; after floating point 24 bits."""

    def __init__(self, path: Path, realization: Realization, info: AudioInfo, *, force: bool) -> None:
        super().__init__(path, rate=info.rate, channels=info.channels, subtype=default_subtype(realization.format),
                         frames_expected=info.frames, overwrite=force)

    def write(self, block: NDArray[np.float64]) -> None:
        """Append a block (frames, channels). What has run away to infinity is full scale, what is NaN is 0."""
        super().write(np.nan_to_num(block, nan=0.0, posinf=1.0, neginf=-1.0))


class DifferenceFile:
    """A difference as 32-bit floats, as it is. One that runs away beyond them is given up, and no file is left."""

    def __init__(self, path: Path, info: AudioInfo, *, force: bool) -> None:
        self._writer = AudioWriter(path, rate=info.rate, channels=info.channels, subtype="float",
                                   frames_expected=info.frames, overwrite=force)
        self.kept = True

    def __enter__(self) -> Self:
        self._writer.__enter__()
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        if self.kept:
            self._writer.__exit__(kind, error, trace)

    def write(self, block: NDArray[np.float64]) -> None:
        """Append a block (frames, channels)."""
        if self.kept and has_run_away(block):
            self.kept = False
            reason = RequestError("the difference is beyond what a file holds")
            self._writer.__exit__(RequestError, reason, None)
        if self.kept:
            self._writer.write(block)
