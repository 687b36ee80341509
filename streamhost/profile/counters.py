"""Retired instructions and cycles of this process, where the host counts them for us (`perf_event_open` of Linux)."""

import ctypes
import errno
import os
import platform
import struct
import sys
from collections.abc import Callable
from dataclasses import dataclass

CALL_NUMBERS = {"x86_64": 298, "aarch64": 241}
HARDWARE, CYCLES, INSTRUCTIONS = 0, 0, 1
ATTRIBUTE_BYTES = 128
FORBIDDEN = (errno.EACCES, errno.EPERM)
EXCLUDE_SYSTEM_AND_HYPERVISOR = 0b1100000
FLAGS_AT = 40


@dataclass(frozen=True)
class Counted:
    """What was retired while something ran; None for both where the host counts nothing, and then why."""

    instructions: int | None = None
    cycles: int | None = None
    reason: str | None = None


def counted(run: Callable[[], object]) -> Counted:
    """Runs once, counting what this thread retires outside the system's own code."""
    files: list[int] = []
    try:
        files += [_open(INSTRUCTIONS), _open(CYCLES)]
        before = [_read(file) for file in files]
        run()
        instructions, cycles = (_read(file) - start for file, start in zip(files, before, strict=True))
        return Counted(instructions, cycles)
    except OSError as problem:
        why = "this host does not permit" if problem.errno in FORBIDDEN else "this host does not offer"
        return Counted(reason=f"{why} hardware counters ({problem.strerror})")
    finally:
        for file in files:
            os.close(file)


def _open(event: int) -> int:
    number = CALL_NUMBERS.get(platform.machine()) if sys.platform == "linux" else None
    if number is None:
        raise OSError(errno.ENOSYS, "no way to them is known here")
    attribute = bytearray(ATTRIBUTE_BYTES)
    struct.pack_into("IIQ", attribute, 0, HARDWARE, ATTRIBUTE_BYTES, event)
    struct.pack_into("Q", attribute, FLAGS_AT, EXCLUDE_SYSTEM_AND_HYPERVISOR)
    library = ctypes.CDLL(None, use_errno=True)
    file = int(library.syscall(number, (ctypes.c_char * ATTRIBUTE_BYTES).from_buffer(attribute), 0, -1, -1, 0))
    if file < 0:
        code = ctypes.get_errno()
        raise OSError(code, os.strerror(code))
    return file


def _read(file: int) -> int:
    return int.from_bytes(os.read(file, 8), sys.byteorder)
