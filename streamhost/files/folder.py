"""A folder appears under its name whole, or not at all."""

import os
import shutil
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path

from streamhost.errors import RequestError
from streamhost.files.atomic import machine_error


def check_new_folder(path: Path, ours: Callable[[Path], bool], *, overwrite: bool) -> None:
    """RequestError where `path` cannot become a folder: it is there and not `overwrite`, or is none of `ours`."""
    if not path.absolute().parent.is_dir():
        raise RequestError(f"{path}: the folder {path.parent} does not exist. Make it first, or choose another.")
    if not path.exists():
        return
    if not path.is_dir():
        raise RequestError(f"{path}: this is a file, and the name of a folder is needed.")
    if not overwrite:
        raise RequestError(f"{path}: this folder exists. Choose another name, or replace it with --force.")
    if not ours(path):
        raise RequestError(f"{path}: this folder holds other files, and would be replaced as a whole. Choose another name.")


@contextmanager
def atomic_folder(path: Path, ours: Callable[[Path], bool], *, overwrite: bool = False) -> Iterator[Path]:
    """A folder to write files into, which takes the name `path` when the block ends well.

    Until then it lies hidden beside it; when the block ends by any exception it is removed with all that is in it. A folder
    of that name goes where `overwrite` and `ours` say so. RequestError and MachineError as `check_new_folder` and the disk say.
    """
    check_new_folder(path, ours, overwrite=overwrite)
    target = path.absolute()
    partial = target.with_name(f".{target.name}.partial-{os.getpid()}")
    try:
        shutil.rmtree(partial, ignore_errors=True)  # left by a killed process whose number came round again
        _mkdir(partial, path)
        yield partial
        check_new_folder(path, ours, overwrite=overwrite)
        _publish(partial, target, path)
    except BaseException:
        shutil.rmtree(partial, ignore_errors=True)
        raise


def _mkdir(partial: Path, shown: Path) -> None:
    try:
        partial.mkdir()
    except OSError as problem:
        raise machine_error("write", shown, problem) from problem


def _publish(partial: Path, target: Path, shown: Path) -> None:
    """Two renames where a folder is replaced; the old one comes back when the second fails."""
    old = target.with_name(f".{target.name}.replaced-{os.getpid()}")
    try:
        if not target.exists():
            partial.rename(target)
            return
        target.rename(old)
        try:
            partial.rename(target)
        except BaseException:
            old.rename(target)
            raise
    except OSError as problem:
        raise machine_error("write", shown, problem) from problem
    shutil.rmtree(old, ignore_errors=True)
