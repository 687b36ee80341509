"""Memory that two processes map: a file without a name, which ends with the last process that has it open."""

import mmap
import os
import tempfile


class Memory:
    """Nothing at first; `handle` is passed to the other process."""

    def __init__(self) -> None:
        self.handle = _unnamed_file()

    def mapped(self, size: int) -> mmap.mmap:
        """So many bytes of it, zeroed where it had been smaller."""
        os.ftruncate(self.handle, size)
        return mapped(self.handle, size)

    def close(self) -> None:
        """The handle only: what has been mapped stays as long as anything looks at it."""
        os.close(self.handle)


def mapped(handle: int, size: int) -> mmap.mmap:
    """The memory of that handle, in the process that it was passed to."""
    return mmap.mmap(handle, size)


def _unnamed_file() -> int:
    if hasattr(os, "memfd_create"):
        return os.memfd_create("streamhost")
    with tempfile.TemporaryFile(prefix="streamhost-") as file:
        return os.dup(file.fileno())
