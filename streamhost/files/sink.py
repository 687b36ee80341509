"""What the audio library writes through, so that the operating system's own errors are kept."""

from io import FileIO

from streamhost.files.atomic import write_fully
from streamhost.files.layout import chunks

_PEAK_TIME = 4  # bytes into the PEAK chunk, after its version


class Sink:
    """A file object for the audio library. No exception can cross the C library: the first stays in `failure`."""

    def __init__(self, stream: FileIO) -> None:
        self.failure: BaseException | None = None
        self._stream = stream

    def write(self, data: bytes) -> int:
        """Write all of it, or answer 0 and keep the reason."""
        try:
            write_fully(self._stream, data)
        except BaseException as error:
            self.failure = self.failure or error
            return 0
        return len(data)

    def seek(self, offset: int, whence: int = 0) -> int:
        return self._stream.seek(offset, whence)

    def tell(self) -> int:
        return self._stream.tell()


def clear_peak_time(stream: FileIO) -> None:
    """Float files carry the second in which they were written; without it equal audio makes equal bytes."""
    for name, start, _ in chunks(stream):
        if name == b"PEAK":
            stream.seek(start + _PEAK_TIME)
            stream.write(bytes(4))
            return
