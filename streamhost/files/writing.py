"""Audio out: exact codes, whole files."""

from collections.abc import Callable
from contextlib import ExitStack, suppress
from io import FileIO
from pathlib import Path
from types import TracebackType
from typing import Any, Literal, Self

import numpy as np
import numpy.typing as npt

from streamhost.errors import AudioFileError, MachineError, nearest
from streamhost.files.atomic import atomic_file, machine_error
from streamhost.files.codes import little_endian, quantize
from streamhost.files.probing import probe
from streamhost.files.reading import check_finite
from streamhost.files.sink import Sink, clear_peak_time
from streamhost.files.wave import PcmWave

Subtype = Literal["pcm16", "pcm24", "pcm32", "float"]

_BITS: dict[str, int] = {"pcm16": 16, "pcm24": 24, "pcm32": 32}
_LIBRARY_NAMES = {"pcm16": "PCM_16", "pcm24": "PCM_24", "pcm32": "PCM_32", "float": "FLOAT"}
_BYTES = {"pcm16": 2, "pcm24": 3, "pcm32": 4, "float": 4}
_EXTENSIONS = {".wav": "WAV", ".rf64": "RF64", ".flac": "FLAC"}
_FLAC_SUBTYPES = ("pcm16", "pcm24")

WAV_LIMIT = 2**32 - 2**20
"""Bytes of audio that a WAV file takes at most; its sizes have 32 bits, and 1 MiB is left for headers."""

_MOST_CHANNELS = {"WAV": 1024, "RF64": 1024, "FLAC": 8}
_HIGHEST_RATE = {"WAV": 2**31 - 1, "RF64": 2**31 - 1, "FLAC": 655350}


def choose_container(path: str | Path, subtype: str, channels: int, frames: int | None) -> str:
    """The container of an output file, "WAV", "RF64" or "FLAC", by its extension and the frames expected (or None).

    A .wav whose audio would pass `WAV_LIMIT` becomes RF64 inside, as is common practice. Raises AudioFileError for an
    extension or a subtype that is not written.
    """
    extension = Path(path).suffix.lower()
    if extension not in _EXTENSIONS:
        raise AudioFileError(
            f'{path}: audio is not written as "{extension}". Allowed extensions are {", ".join(_EXTENSIONS)}.'
            + nearest(extension, _EXTENSIONS)
        )
    if subtype not in _LIBRARY_NAMES:
        raise AudioFileError(
            f'{path}: there is no sample format "{subtype}". Allowed are {", ".join(_LIBRARY_NAMES)}.'
            + nearest(subtype, _LIBRARY_NAMES)
        )
    container = _EXTENSIONS[extension]
    if container == "FLAC" and subtype not in _FLAC_SUBTYPES:
        raise AudioFileError(
            f"{path}: a FLAC file does not hold {subtype} samples. Allowed are {', '.join(_FLAC_SUBTYPES)}; "
            "for more, write .wav."
        )
    if container == "WAV" and frames is not None and frames * channels * _BYTES[subtype] > WAV_LIMIT:
        return "RF64"
    return container


class AudioWriter:
    """Writes one audio file, to be used in a `with` block: at its end the file is there, whole; else nothing is.

    `rate` in Hz; `channels` >= 1; `subtype` "pcm16", "pcm24", "pcm32" or "float" (32 bits). PCM codes are rounded here,
    ties to even, and saturated: `clipped` counts the samples that were. `frames` counts the frames written.

    Raises AudioFileError where the request is wrong (extension, subtype, folder, an existing file without `overwrite`),
    at once; and while writing where a sample is not finite, or a WAV file whose length was not announced by
    `frames_expected` outgrows 4 GiB. Raises MachineError where the disk is full or may not be written.
    """

    def __init__(
        self,
        path: str | Path,
        *,
        rate: int,
        channels: int,
        subtype: Subtype,
        frames_expected: int | None = None,
        overwrite: bool = False,
    ) -> None:
        self.path = Path(path)
        self.rate = rate
        self.channels = channels
        self.subtype = subtype
        self.container = choose_container(self.path, subtype, channels, frames_expected)
        self.frames = 0
        self.clipped = 0
        self._overwrite = overwrite
        self._sound: Any = None
        self._check_capacity()

    def __enter__(self) -> Self:
        with ExitStack() as stack:
            file = atomic_file(self.path, overwrite=self._overwrite, refusal=AudioFileError)
            self._stream = stack.enter_context(file)
            self._sink = Sink(self._stream)
            stack.push(self._close)
            self._run(self._open)
            self._stack = stack.pop_all()
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self._stack.__exit__(kind, error, trace)

    def write(self, block: npt.NDArray[np.float64]) -> None:
        """Append a block (n, channels), 1.0 = full scale. Of a block that raises, nothing counts as written."""
        if block.ndim != 2 or block.shape[1] != self.channels:
            raise AudioFileError(
                f"{self.path}: a block of shape {block.shape} does not fit: (frames, {self.channels}) is needed."
            )
        check_finite(block, self.frames, self.path)
        self._check_room(len(block))
        data, clipped = self._encode(block)
        self._run(lambda: self._sound.write(data))
        self.frames += len(block)
        self.clipped += clipped

    def _encode(self, block: npt.NDArray[np.float64]) -> tuple[npt.NDArray[Any] | bytes, int]:
        if self.subtype == "float":
            with np.errstate(over="ignore"):
                single = block.astype(np.float32)
            check_finite(single, self.frames, self.path)
            return single, 0
        bits = _BITS[self.subtype]
        codes, clipped = quantize(block, bits)
        return little_endian(codes, bits) if self._writes_bytes else codes << (32 - bits), clipped

    @property
    def _writes_bytes(self) -> bool:
        """PCM in WAV and RF64 we write ourselves, at a third of the library's time."""
        return self.container != "FLAC" and self.subtype != "float"

    def _check_capacity(self) -> None:
        channels, rate = _MOST_CHANNELS[self.container], _HIGHEST_RATE[self.container]
        if not 1 <= self.channels <= channels:
            raise AudioFileError(
                f"{self.path}: {self.container} does not hold {self.channels} channels. Allowed are 1 to {channels}."
            )
        if not 1 <= self.rate <= rate:
            raise AudioFileError(
                f"{self.path}: {self.container} does not hold a rate of {self.rate} Hz. Allowed are 1 to {rate} Hz."
            )

    def _check_room(self, more: int) -> None:
        size = (self.frames + more) * self.channels * _BYTES[self.subtype]
        if self.container == "WAV" and size > WAV_LIMIT:
            raise AudioFileError(
                f"{self.path}: the audio outgrows the 4 GiB of a WAV file at frame {self.frames}. Name the file .rf64 "
                "(or .flac), or say beforehand how many frames will come."
            )

    def _open(self) -> None:
        if self._writes_bytes:
            self._sound = PcmWave(self._sink, self.container, self.rate, self.channels, _BITS[self.subtype])
            return
        import soundfile

        subtype = _LIBRARY_NAMES[self.subtype]
        self._sound = soundfile.SoundFile(
            self._sink, "w", self.rate, self.channels, subtype=subtype, format=self.container
        )

    def _run(self, action: Callable[[], None]) -> None:
        """Do something with the audio library, and say what the disk said in place of what the library makes of it."""
        import soundfile

        problem: Exception | None = None
        try:
            action()
        except (AssertionError, soundfile.SoundFileError, OSError) as error:  # it asserts that all was written
            problem = error
        failure = self._sink.failure or problem
        if isinstance(failure, OSError):
            raise machine_error("write", self.path, failure) from failure
        if isinstance(failure, (AssertionError, soundfile.SoundFileError)):
            raise MachineError(f"{self.path}: cannot write this file: {failure}. Check that disk.") from failure
        if failure is not None:
            raise failure

    def _close(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        if kind is not None:
            with suppress(Exception):  # the first error is the one to tell; the file is thrown away
                if self._sound is not None:
                    self._sound.close()
            return
        if self.frames == 0:
            self._sound.close()
            raise AudioFileError(f"{self.path}: no frame was written. A file has at least 1.")
        self._run(self._sound.close)
        self._run(lambda: clear_peak_time(self._stream))
        self._check_arrived(self._stream)

    def _check_arrived(self, stream: FileIO) -> None:
        """The header is written last, through calls whose errors the library drops: read it back."""
        try:
            arrived = probe(str(stream.name)).frames
        except AudioFileError:
            arrived = 0
        if arrived != self.frames:
            raise MachineError(
                f"{self.path}: {self.frames} frames were written and {arrived} arrived. Check that disk."
            )
