"""How much audio a file's header promises, and how much of it is in the file.

The audio library reads a truncated file to its end without a word, so the chunks are walked here.
RIFF and RF64: EBU Tech 3306. AIFF: "Audio Interchange File Format", version 1.3. W64 after its common description.
"""

import struct
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import BinaryIO

RIFF_LIMIT = 2**32
"""A RIFF chunk states its size in 32 bits, and the largest number says that the size is not known, or elsewhere."""

_W64_TAIL = bytes.fromhex("f3acd3118cd100c04f8edb8a")


@dataclass(frozen=True)
class AudioData:
    """Where the audio lies: bytes from the start of the file, bytes promised, bytes of the whole file."""

    start: int
    promised: int
    file_size: int

    @property
    def present(self) -> int:
        """Bytes of the promised audio that are in the file."""
        return max(0, min(self.promised, self.file_size - self.start))


def find_audio(path: Path) -> AudioData | None:
    """The audio data of a RIFF, RF64, AIFF or W64 file; None for other files and where no audio is found."""
    with path.open("rb") as stream:
        size = stream.seek(0, 2)
        stream.seek(0)
        head = stream.read(40)
        if head[:4] in (b"RIFF", b"RIFX") and head[8:12] == b"WAVE":
            return _riff(stream, size, "<" if head[:4] == b"RIFF" else ">")
        if head[:4] == b"RF64" and head[8:12] == b"WAVE":
            return _rf64(stream, size)
        if head[:4] == b"FORM" and head[8:12] in (b"AIFF", b"AIFC"):
            return _aiff(stream, size)
        if head[:4] == b"riff" and head[24:28] == b"wave":
            return _w64(stream, size)
    return None


def chunks(stream: BinaryIO, order: str = "<") -> Iterator[tuple[bytes, int, int]]:
    """Name, start of content and stated size of each chunk after the 12 bytes of the outer one."""
    place = 12
    while True:
        stream.seek(place)
        head = stream.read(8)
        if len(head) < 8:
            return
        name, size = struct.unpack(f"{order}4sI", head)
        yield name, place + 8, size
        place += 8 + size + size % 2


def _riff(stream: BinaryIO, file_size: int, order: str) -> AudioData | None:
    for name, start, size in chunks(stream, order):
        if name == b"data":
            unknown = size == RIFF_LIMIT - 1  # written to a pipe: the audio runs to the end of the file
            return AudioData(start, file_size - start if unknown else size, file_size)
    return None


def _rf64(stream: BinaryIO, file_size: int) -> AudioData | None:
    long_size = 0
    for name, start, size in chunks(stream):
        if name == b"ds64":
            stream.seek(start)
            content = stream.read(16)
            if len(content) < 16:
                return None
            long_size = struct.unpack("<QQ", content)[1]
        if name == b"data":
            return AudioData(start, long_size if size == RIFF_LIMIT - 1 else size, file_size)
    return None


def _aiff(stream: BinaryIO, file_size: int) -> AudioData | None:
    for name, start, size in chunks(stream, ">"):
        if name == b"SSND":  # begins with two numbers of four bytes each, an offset and a block size
            return AudioData(start + 8, max(0, size - 8), file_size)
    return None


def _w64(stream: BinaryIO, file_size: int) -> AudioData | None:
    place = 40
    while True:
        stream.seek(place)
        head = stream.read(24)
        if len(head) < 24:
            return None
        size = struct.unpack("<Q", head[16:])[0]
        if head[:16] == b"data" + _W64_TAIL:
            return AudioData(place + 24, max(0, size - 24), file_size)
        place += max(24, size + -size % 8)
