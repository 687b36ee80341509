"""A file appears under its name whole, or not at all."""

import errno
import os
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from io import FileIO
from pathlib import Path

from streamhost.errors import MachineError, RequestError

_REMEDIES = {
    errno.ENOSPC: "Free some space there, or write to another disk.",
    errno.EDQUOT: "The quota there is used up: free some of it, or write to another disk.",
    errno.EFBIG: "The system allows no file of this size there: write to another disk or raise the limit.",
    errno.EACCES: "Choose a place that you may write to, or change its permissions.",
    errno.EPERM: "Choose a place that you may write to, or change its permissions.",
    errno.EROFS: "That disk is read-only: choose another place.",
    errno.ENAMETOOLONG: "Choose a shorter file name.",
}


def machine_error(action: str, path: Path, problem: OSError) -> MachineError:
    """Our error for an operating-system error, with its remedy. `action` reads like "write" or "read"."""
    remedy = _REMEDIES.get(problem.errno or 0, "Check that disk and try again.")
    if action == "read" and problem.errno in (errno.EACCES, errno.EPERM):
        remedy = "Ask for permission to read it, or read a copy of your own."
    return MachineError(f"{path}: cannot {action} this file: {problem.strerror or problem}. {remedy}")


def same_file(first: str | Path, second: str | Path) -> bool:
    """Whether two paths lead to one file, through links too; of files that do not exist the names are compared."""
    try:
        return Path(first).samefile(second)
    except OSError:
        return Path(first).resolve() == Path(second).resolve()


@contextmanager
def atomic_file(
    path: str | Path, *, overwrite: bool = False, refusal: type[RequestError] = RequestError
) -> Iterator[FileIO]:
    """An unbuffered binary file, open for writing and reading, that becomes `path` when the block ends well.

    Until then it lies hidden in the same folder; when the block ends by any exception it is removed. Through a
    symbolic link the file it leads to is written. Raises `refusal` where the request is wrong (no such folder, not a
    regular file, exists and not `overwrite`) and MachineError where the machine fails.
    """
    shown = Path(path)
    target = _checked_target(shown, overwrite, refusal)
    partial = target.with_name(f".{target.name}.partial-{os.getpid()}")
    stream = _create(partial, shown)
    try:
        with stream:
            yield stream
            _settle(stream, shown)
        _publish(partial, target, shown, overwrite, refusal)
    except BaseException:
        partial.unlink(missing_ok=True)
        raise


@contextmanager
def all_or_none(paths: Sequence[Path]) -> Iterator[None]:
    """Files that belong together: where the block ends by an exception, those that had appeared by then go again."""
    before = [identity(path) for path in paths]
    try:
        yield
    except BaseException:
        for path, was in zip(paths, before, strict=True):
            if identity(path) not in (None, was):
                path.unlink()
        raise


def identity(path: Path) -> int | None:
    """What tells a file from another that takes its name; None where there is none."""
    return path.stat().st_ino if path.exists() else None


def write_bytes_atomic(path: str | Path, data: bytes, *, overwrite: bool = False) -> None:
    """Write a whole file, or leave nothing. Raises RequestError and MachineError as `atomic_file` does."""
    with atomic_file(path, overwrite=overwrite) as stream:
        try:
            write_fully(stream, data)
        except OSError as problem:
            raise machine_error("write", Path(path), problem) from problem


def write_text_atomic(path: str | Path, text: str, *, overwrite: bool = False) -> None:
    """Write a whole UTF-8 file, line ends as they are in `text`, or leave nothing."""
    write_bytes_atomic(path, text.encode("utf-8"), overwrite=overwrite)


def write_fully(stream: FileIO, data: bytes) -> None:
    """Write all of `data`; an unbuffered file may take only part of it at once, as on a disk that fills up."""
    rest = memoryview(data)
    while rest:
        rest = rest[stream.write(rest) :]


def _checked_target(shown: Path, overwrite: bool, refusal: type[RequestError]) -> Path:
    try:
        target = shown.resolve()
        if not target.parent.is_dir():
            raise refusal(f"{shown}: the folder {shown.parent} does not exist. Make it first, or choose another.")
        if target.is_dir():
            raise refusal(f"{shown}: this is a folder. Give the name of a file in it.")
        if target.exists() and not target.is_file():
            raise refusal(f"{shown}: this is a device or a pipe. Only regular files are written.")
        if target.exists() and not overwrite:
            raise _exists(shown, refusal)
    except RequestError:
        raise
    except (OSError, RuntimeError) as problem:  # RuntimeError: a circle of links, before Python 3.13
        failure = problem if isinstance(problem, OSError) else OSError(errno.ELOOP, str(problem))
        raise machine_error("write", shown, failure) from problem
    return target


def _exists(shown: Path, refusal: type[RequestError]) -> RequestError:
    return refusal(f"{shown}: this file exists. Choose another name, or overwrite it with --force.")


def _create(partial: Path, shown: Path) -> FileIO:
    try:
        partial.unlink(missing_ok=True)  # left by a killed process whose number came round again
        return FileIO(partial, "x+")
    except OSError as problem:
        raise machine_error("write", shown, problem) from problem


def _settle(stream: FileIO, shown: Path) -> None:
    try:
        os.fsync(stream.fileno())
    except OSError as problem:
        raise machine_error("write", shown, problem) from problem


def _publish(partial: Path, target: Path, shown: Path, overwrite: bool, refusal: type[RequestError]) -> None:
    try:
        if overwrite:
            partial.replace(target)
        else:
            _place_new(partial, target)
    except FileExistsError as problem:
        raise _exists(shown, refusal) from problem
    except OSError as problem:
        raise machine_error("write", shown, problem) from problem


def _place_new(partial: Path, target: Path) -> None:
    """A hard link is the one step that fails where a file has appeared meanwhile; some disks have none."""
    try:
        target.hardlink_to(partial)
    except FileExistsError:
        raise
    except OSError as problem:
        if target.exists():
            raise FileExistsError(errno.EEXIST, os.strerror(errno.EEXIST)) from problem
        partial.replace(target)
    else:
        partial.unlink()
