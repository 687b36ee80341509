"""Audio files for tests: written and read by hand or by the standard library, and by the program in one line."""

import os
import resource
import struct
import wave
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import numpy as np

from streamhost.files import AudioWriter
from streamhost.files.writing import Subtype

NOBODY = 65534


def wav_bytes(codes: list[int], bits: int, channels: int = 1, data_size: int | None = None) -> bytes:
    """A WAV file put together by hand, so that reading is not checked against the library that reads."""
    width = bits // 8
    data = b"".join(code.to_bytes(width, "little", signed=True) for code in codes)
    size = len(data) if data_size is None else data_size
    form = struct.pack("<4sIHHIIHH", b"fmt ", 16, 1, channels, 48000, 48000 * channels * width, channels * width, bits)
    return struct.pack("<4sI4s", b"RIFF", 36 + len(data), b"WAVE") + form + struct.pack("<4sI", b"data", size) + data


def write(path: Path, samples: np.ndarray, subtype: Subtype = "pcm16", **options: object) -> AudioWriter:
    with AudioWriter(path, rate=48000, channels=samples.shape[1], subtype=subtype, **options) as writer:  # type: ignore[arg-type]
        writer.write(samples)
    return writer


def wav_codes(path: Path) -> list[int]:
    """By the standard library, which has no part in the writing."""
    with wave.open(str(path)) as file:
        width, data = file.getsampwidth(), file.readframes(file.getnframes())
    return [int.from_bytes(data[i : i + width], "little", signed=True) for i in range(0, len(data), width)]


def noise(frames: int, channels: int = 2) -> np.ndarray:
    return np.random.default_rng(2).uniform(-1, 1, (frames, channels))


@contextmanager
def no_privileges() -> Iterator[None]:
    """The rights of nobody where the tests run as root, who may read and write all."""
    if os.geteuid() != 0:
        yield
        return
    os.seteuid(NOBODY)
    try:
        yield
    finally:
        os.seteuid(0)


@contextmanager
def file_size_limit(size: int) -> Iterator[None]:
    """The system refuses to let any file grow beyond `size`, as a full disk would; needs no privilege."""
    soft, hard = resource.getrlimit(resource.RLIMIT_FSIZE)
    resource.setrlimit(resource.RLIMIT_FSIZE, (size, hard))
    try:
        yield
    finally:
        resource.setrlimit(resource.RLIMIT_FSIZE, (soft, hard))
