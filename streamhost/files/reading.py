"""Audio in, block by block."""

from collections.abc import Iterator
from pathlib import Path

import numpy as np
import numpy.typing as npt

from streamhost.errors import AudioFileError
from streamhost.files.probing import AudioInfo, open_sound, probe, truncated

_FLOATS = ("FLOAT", "DOUBLE")


def read_blocks(path: str | Path, frames: int = 4096) -> Iterator[npt.NDArray[np.float64]]:
    """The file's samples as blocks (n, channels), n = `frames` but for the last, 1.0 = full scale.

    An integer code k of a B-bit word arrives as k / 2**(B - 1) exactly. Every block is the same memory, filled
    anew: copy what must outlive the next step. The file is checked at the call as `probe` does; while reading,
    AudioFileError where a sample is not finite or the file ends early.
    """
    if frames < 1:
        raise AudioFileError(f"{path}: blocks of {frames} frames cannot be read. At least 1 is needed.")
    return _blocks(probe(path), frames)


def read_all(path: str | Path) -> tuple[npt.NDArray[np.float64], AudioInfo]:
    """All samples (frames, channels) and what the file is. Raises as `read_blocks` does."""
    info = probe(path)
    samples = np.empty((info.frames, info.channels))
    start = 0
    for block in _blocks(info, 65536):
        samples[start : start + len(block)] = block
        start += len(block)
    return samples, info


def _blocks(info: AudioInfo, frames: int) -> Iterator[npt.NDArray[np.float64]]:
    import soundfile

    memory = np.empty((frames, info.channels))
    start = 0
    with open_sound(info.path) as sound:
        while start < info.frames:
            try:
                block = sound.read(dtype="float64", always_2d=True, out=memory)
            except soundfile.LibsndfileError as problem:
                raise truncated(info.path, start, info.frames) from problem
            if len(block) < min(frames, info.frames - start):
                raise truncated(info.path, start + len(block), info.frames)
            if info.subtype in _FLOATS:
                check_finite(block, start, info.path)
            yield block
            start += len(block)


def check_finite(block: npt.NDArray[np.floating], start: int, path: Path) -> None:
    """AudioFileError naming the first sample of the block (frames, channels) that is NaN or infinite."""
    with np.errstate(all="ignore"):
        if np.isfinite(block.sum()):  # proves it for every sample in one pass
            return
    bad = np.argwhere(~np.isfinite(block))
    if len(bad) == 0:
        return
    frame, channel = (int(index) for index in bad[0])
    raise AudioFileError(
        f"{path}: frame {start + frame}, channel {channel + 1} is {block[frame, channel]}. Samples are finite numbers, "
        "1.0 = full scale."
    )
