"""Where compiled kernels are kept, and what is said when they cannot be."""

import atexit
import contextlib
import functools
import hashlib
import os
import platform
import re
import shutil
import stat
import sys
import tempfile
from pathlib import Path

_notices: list[str] = []


def notice() -> str | None:
    """What first went wrong with the cache in this process, as a paragraph for the user; None if nothing did."""
    return _notices[0] if _notices else None


def add_notice(text: str) -> None:
    """Keep a paragraph for `notice()`; the first one is the one that is shown."""
    _notices.append(text)


def kernel_folder() -> Path | None:
    """The folder that this process keeps compiled kernels in; made if need be. Imports numba.

    `$STREAMHOST_CACHE`, else `$XDG_CACHE_HOME/streamhost`, else `~/.cache/streamhost`; in it one folder for each
    numba, Python and processor. A folder that cannot be written, or that others could write to, is not used: a
    temporary one takes its place, is removed when the process ends, and `notice()` says so. None if there is no room
    for that either.
    """
    return _prepared(_wanted_folder())


def _wanted_folder() -> Path | None:
    if chosen := os.environ.get("STREAMHOST_CACHE"):
        return Path(chosen).absolute()
    caches = Path(os.environ.get("XDG_CACHE_HOME", ""))
    if caches.is_absolute():  # the XDG base directory specification has relative paths ignored
        return caches / "streamhost"
    with contextlib.suppress(RuntimeError):
        return Path.home() / ".cache" / "streamhost"
    return None


@functools.cache
def _prepared(base: Path | None) -> Path | None:
    try:
        if base is None:
            raise FileNotFoundError("there is no home folder")
        return _private_folders(base)
    except OSError as problem:
        reason = str(problem)
    folder = _temporary_folder()
    add_notice(
        f"Compiled kernels are {'kept for this run only' if folder else 'not kept at all'}, so every start compiles "
        f"them again: {reason}. Set STREAMHOST_CACHE to a folder that you, and only you, can write to."
    )
    return folder


def _temporary_folder() -> Path | None:
    try:
        base = Path(tempfile.mkdtemp(prefix="streamhost-"))
        atexit.register(shutil.rmtree, base, ignore_errors=True)
        return _private_folders(base)
    except OSError:
        return None


def _private_folders(base: Path) -> Path:
    folder = base / _machine()
    for each in (base, folder, folder / "__pycache__"):
        each.mkdir(mode=0o700, parents=True, exist_ok=True)
        _refuse_if_others_write(each)
    tempfile.TemporaryFile(dir=folder / "__pycache__").close()
    return folder


def _refuse_if_others_write(folder: Path) -> None:
    if not hasattr(os, "getuid"):
        return
    status = folder.stat()
    if status.st_uid != os.getuid():
        raise PermissionError(f"the folder {folder} belongs to another user")
    if status.st_mode & (stat.S_IWGRP | stat.S_IWOTH):
        raise PermissionError(f"others can write to the folder {folder}")


@functools.cache
def _machine() -> str:
    import numba
    from llvmlite import binding

    try:
        features = binding.get_host_cpu_features().flatten()
    except RuntimeError:  # llvmlite's word for a processor that it cannot ask
        features = ""
    parts = (
        f"numba-{numba.__version__}",
        str(sys.implementation.cache_tag),
        platform.machine(),
        binding.get_host_cpu_name(),
        hashlib.sha256(features.encode()).hexdigest()[:8],
    )
    return re.sub(r"[^A-Za-z0-9._-]", "_", "-".join(parts))
