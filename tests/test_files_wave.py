"""PCM in WAV and RF64, written by hand: the very bytes that others write, and sizes beyond 32 bits."""

import io
import struct
from pathlib import Path

import numpy as np
import pytest
import soundfile

from streamhost.files.codes import little_endian, quantize
from streamhost.files.wave import PcmWave

LIBRARY = {16: "PCM_16", 24: "PCM_24", 32: "PCM_32"}


@pytest.mark.parametrize("bits", [16, 24, 32])
@pytest.mark.parametrize(("frames", "channels"), [(1, 1), (3, 1), (4, 2), (7, 5)])
def test_a_wav_has_the_bytes_that_the_audio_library_writes(
    tmp_path: Path, bits: int, frames: int, channels: int
) -> None:
    top = 2 ** (bits - 1)
    codes = np.random.default_rng(3).integers(-top, top, (frames, channels)).astype(np.int32)
    soundfile.write(tmp_path / "a.wav", codes << (32 - bits), 44100, subtype=LIBRARY[bits])
    stream = io.BytesIO()
    wave = PcmWave(stream, "WAV", 44100, channels, bits)
    for part in np.array_split(codes, 2):
        wave.write(little_endian(part, bits))
    wave.close()
    assert stream.getvalue() == (tmp_path / "a.wav").read_bytes()


@pytest.mark.parametrize("bits", [16, 24, 32])
def test_an_rf64_is_read_by_the_audio_library(tmp_path: Path, bits: int) -> None:
    codes, clipped = quantize(np.array([[0.5, -1.0, 0.25], [0.125, 0.0, -0.5], [-0.25, 0.0, 0.5]]), bits)
    stream = io.BytesIO()
    wave = PcmWave(stream, "RF64", 48000, 3, bits)
    wave.write(little_endian(codes, bits))
    wave.close()
    (tmp_path / "a.rf64").write_bytes(stream.getvalue())
    back, rate = soundfile.read(tmp_path / "a.rf64", dtype="int32")
    assert (rate, clipped, (back >> (32 - bits)).tolist()) == (48000, 0, codes.tolist())


class Header:
    """Keeps what is written at the start, as a file too large for a test would have it."""

    def __init__(self) -> None:
        self.first = b""
        self._place = 0

    def write(self, data: bytes) -> int:
        if self._place == 0:
            self.first = bytes(data)
        self._place += len(data)
        return len(data)

    def seek(self, offset: int, whence: int = 0) -> int:
        self._place = offset
        return offset


class Much(bytes):
    """Audio of which only the length is looked at."""

    def __len__(self) -> int:
        return 3 * 2**31 - 3


def test_sizes_beyond_32_bits_stand_in_the_chunk_for_them() -> None:
    # EBU Tech 3306: RF64, size 0xFFFFFFFF, WAVE; ds64 holds RIFF size, data size, sample count, each in 64 bits.
    header = Header()
    wave = PcmWave(header, "RF64", 48000, 1, 24)
    wave.write(Much())
    wave.close()
    name, size, kind, chunk, length, whole, data, frames, table = struct.unpack_from("<4sI4s4sIQQQI", header.first)
    assert (name, size, kind, chunk, length, table) == (b"RF64", 2**32 - 1, b"WAVE", b"ds64", 28, 0)
    odd_end = 1
    assert (data, frames, whole) == (3 * 2**31 - 3, 2**31 - 1, len(header.first) - 8 + data + odd_end)
    assert header.first[-8:] == b"data" + b"\xff" * 4


def test_bytes_per_second_beyond_32_bits_are_stated_as_the_most_that_can_be() -> None:
    header = Header()
    PcmWave(header, "WAV", 2**31 - 1, 1024, 32).close()
    assert struct.unpack_from("<HHIIHH", header.first, 20) == (1, 1024, 2**31 - 1, 2**32 - 1, 4096, 32)
