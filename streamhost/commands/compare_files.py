"""The files of a comparison: their names, and what is written into them."""

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from types import TracebackType
from typing import Self

import numpy as np
from numpy.typing import NDArray

from streamhost.errors import MachineError, RequestError
from streamhost.files import AudioInfo, AudioWriter, same_file
from streamhost.host.rendering import default_subtype
from streamhost.presets import Preset
from streamhost.realization import Realization

LARGEST = float(np.finfo(np.float32).max)


@dataclass(frozen=True)
class Destination:
    """Where the output and the difference of one realization go."""

    folder: Path
    output: Path
    difference: Path


def destinations(
    folder: str | None, presets: Sequence[Preset], info: AudioInfo, *, force: bool
) -> list[Destination] | list[None]:
    """The files of each preset: its number in the comparison, and its name. No folder, no files.

    RequestError where the folder cannot be one or holds one of the files, unless `force`.
    """
    if folder is None:
        return [None] * len(presets)
    place = Path(folder)
    if place.exists() and not place.is_dir():
        raise RequestError(f"{place}: this is a file, and --output takes the name of a folder.")
    if not place.absolute().parent.is_dir():
        raise RequestError(f"{place}: the folder {place.parent} does not exist. Make it first, or choose another.")
    digits = len(str(len(presets)))
    found = []
    for number, preset in enumerate(presets, 1):
        name = f"{number:0{digits}}-{preset.path.stem if preset.path else 'preset'}"
        found.append(Destination(place, place / f"{name}.wav", place / f"{name}-difference.wav"))
    for destination in found:
        check_new(destination.output, info, force=force)
        check_new(destination.difference, info, force=force)
    return found


def make_folder(folder: Path) -> None:
    """The folder, unless it is there. MachineError where it cannot be made."""
    try:
        folder.mkdir(exist_ok=True)
    except OSError as problem:
        raise MachineError(f"{folder}: cannot make this folder: {problem.strerror}. Choose another place.") from problem


def check_new(path: Path, info: AudioInfo, *, force: bool) -> None:
    """RequestError for the input itself, and for a file that exists unless `force`."""
    if same_file(path, info.path):
        raise RequestError(f"{path}: this would be written over the input. Choose another name.")
    if path.exists() and not force:
        raise RequestError(f"{path}: this file exists. Choose another name, or overwrite it with --force.")


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
        if self.kept and not (np.abs(block) <= LARGEST).all():
            self.kept = False
            reason = RequestError("the difference is beyond what a file holds")
            self._writer.__exit__(RequestError, reason, None)
        if self.kept:
            self._writer.write(block)
