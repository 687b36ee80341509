"""PCM in a WAV or RF64 file, header and all, so that long files are written at the speed of the disk.

RIFF and RF64: EBU Tech 3306. The header is written first with the sizes of nothing and again at the end.
"""

import struct
from typing import Protocol

_LARGEST = 2**32 - 1
"""Of what a header states in 32 bits; as a size in an RF64 file it says that the size stands elsewhere."""

_PCM = 1
_SIZES_64 = 28  # content of the chunk with the sizes in 64 bits


class _Target(Protocol):
    def write(self, data: bytes) -> int: ...
    def seek(self, offset: int, whence: int = 0) -> int: ...


class PcmWave:
    """A file being written; `container` is "WAV" or "RF64". What does not reach the target is the target's to tell."""

    def __init__(self, target: _Target, container: str, rate: int, channels: int, bits: int) -> None:
        self._target, self._container = target, container
        self._rate, self._channels, self._bits = rate, channels, bits
        self._size = 0
        target.write(self._header())

    def write(self, data: bytes) -> None:
        """Append audio as it stands in the file."""
        self._target.write(data)
        self._size += len(data)

    def close(self) -> None:
        """Complete the file; chunks end at an even place."""
        if self._size % 2:
            self._target.write(b"\0")
        self._target.seek(0)
        self._target.write(self._header())

    def _header(self) -> bytes:
        form = self._format()
        if self._container == "WAV":
            whole = len(form) + 12 + self._size + self._size % 2
            return struct.pack("<4sI4s", b"RIFF", whole, b"WAVE") + form + struct.pack("<4sI", b"data", self._size)
        frame = self._channels * self._bits // 8
        whole = len(form) + 12 + 8 + _SIZES_64 + self._size + self._size % 2
        sizes = struct.pack("<4sIQQQI", b"ds64", _SIZES_64, whole, self._size, self._size // frame, 0)
        return struct.pack("<4sI4s", b"RF64", _LARGEST, b"WAVE") + sizes + form + struct.pack("<4sI", b"data", _LARGEST)

    def _format(self) -> bytes:
        frame = self._channels * self._bits // 8
        return struct.pack(
            "<4sIHHIIHH",
            b"fmt ",
            16,
            _PCM,
            self._channels,
            self._rate,
            min(self._rate * frame, _LARGEST),
            frame,
            self._bits,
        )
