"""What an audio file holds, and whether it is whole."""

import stat
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from streamhost.errors import AudioFileError
from streamhost.files.atomic import machine_error
from streamhost.files.layout import RIFF_LIMIT, find_audio

BYTES_PER_SAMPLE = {
    "PCM_S8": 1,
    "PCM_U8": 1,
    "PCM_16": 2,
    "PCM_24": 3,
    "PCM_32": 4,
    "FLOAT": 4,
    "DOUBLE": 8,
}
"""The sample formats that are read, by the audio library's names."""

_READ_CONTAINERS = ("WAV", "WAVEX", "RF64", "W64", "FLAC", "AIFF")
_MOST_FRAMES = 2**62  # the audio library's "not stated" lies above

_ALLOWED = "Allowed are WAV, RF64, W64 and AIFF with PCM or float samples, and FLAC."


@dataclass(frozen=True)
class AudioInfo:
    """What is known of a whole, readable audio file. `frames` >= 1; `subtype` and `container` as in "PCM_24", "WAV"."""

    path: Path
    rate: int
    channels: int
    frames: int
    subtype: str
    container: str

    @property
    def seconds(self) -> float:
        return self.frames / self.rate


def probe(path: str | Path) -> AudioInfo:
    """What the file holds, after every check that needs no full reading.

    Raises AudioFileError where the file is missing, a folder, empty, not audio, of a kind that is not read, truncated
    or without a frame; MachineError where it may not be read or the disk fails.
    """
    place = Path(path)
    try:
        size = _size(place)
        info, last_frame = _header(place)
        _check_whole(info, size, last_frame)
    except OSError as problem:
        raise machine_error("read", place, problem) from problem
    return info


def open_sound(path: Path) -> Any:
    """The audio library's open file; its errors pass through."""
    import os
    import sys

    import soundfile

    return soundfile.SoundFile(str(path) if sys.platform == "win32" else os.fsencode(path))


def _size(path: Path) -> int:
    try:
        status = path.stat()
    except (FileNotFoundError, NotADirectoryError) as problem:
        raise AudioFileError(f"{path}: there is no such file. Check the name and the folder.") from problem
    if stat.S_ISDIR(status.st_mode):
        raise AudioFileError(f"{path}: this is a folder. Give the name of an audio file in it.")
    if not stat.S_ISREG(status.st_mode):
        raise AudioFileError(f"{path}: this is a device or a pipe. Only regular files are read.")
    if status.st_size == 0:
        raise AudioFileError(f"{path}: this file is empty (0 bytes). {_ALLOWED}")
    with path.open("rb"):  # the audio library does not say that it may not read
        return status.st_size


def _header(path: Path) -> tuple[AudioInfo, bool]:
    """What the header says, and whether the last frame can be read."""
    import soundfile

    try:
        # A name that ends in .raw makes the library ask for what no header says: TypeError.
        with open_sound(path) as sound:
            info = AudioInfo(path, sound.samplerate, sound.channels, sound.frames, sound.subtype, sound.format)
            _check_kind(info)
            return info, _reaches_last_frame(sound)
    except (soundfile.LibsndfileError, TypeError) as problem:
        raise AudioFileError(f"{path}: this is no audio file, or its header is damaged. {_ALLOWED}") from problem


def _check_kind(info: AudioInfo) -> None:
    if info.container not in _READ_CONTAINERS or info.subtype not in BYTES_PER_SAMPLE:
        raise AudioFileError(
            f"{info.path}: {info.container} with {info.subtype} samples is not read. {_ALLOWED} Convert it first."
        )
    if info.frames > _MOST_FRAMES:
        raise AudioFileError(
            f"{info.path}: its header does not say how many frames it holds, so whether it is whole cannot be known. "
            "Write it again as a file, not through a pipe."
        )


def _reaches_last_frame(sound: Any) -> bool:
    import soundfile

    if sound.frames == 0:
        return True
    try:
        sound.seek(sound.frames - 1)
        return len(sound.read(1)) == 1
    except soundfile.LibsndfileError:
        return False


def _check_whole(info: AudioInfo, size: int, last_frame: bool) -> None:
    if info.container in ("WAV", "WAVEX") and size > RIFF_LIMIT + 2**20:
        raise AudioFileError(
            f"{info.path}: a WAV file cannot state more than 4 GiB, and this one has {size} bytes, so its header "
            "cannot be true. Write it again as RF64, W64 or FLAC."
        )
    data = find_audio(info.path)
    if data is None and info.container != "FLAC":
        raise AudioFileError(
            f"{info.path}: the way through this file's chunks does not lead to its audio, so whether it is whole "
            "cannot be known. Write it again with another program."
        )
    if data is not None and data.present < data.promised:
        frame = info.channels * BYTES_PER_SAMPLE[info.subtype]
        raise truncated(info.path, data.present // frame, data.promised // frame)
    if not last_frame:
        raise truncated(info.path, _count_readable(info.path), info.frames)
    if info.frames == 0:
        raise AudioFileError(
            f"{info.path}: there is no audio in this file: its header says 0 frames. At least 1 is needed."
        )


def truncated(path: Path, present: int, promised: int) -> AudioFileError:
    """The error for a file that ends before its header says."""
    return AudioFileError(
        f"{path}: this file is truncated or damaged: its header promises {promised} frames, {present} can be read. "
        "Only whole files are read: copy or record it again."
    )


def _count_readable(path: Path) -> int:
    import soundfile

    count = 0
    with open_sound(path) as sound:
        try:
            while part := len(sound.read(1024, always_2d=True)):
                count += part
        except soundfile.LibsndfileError:
            pass
    return count
