"""Keeping the cache small."""

import contextlib
import re
import time
from dataclasses import dataclass, field
from pathlib import Path

from streamhost.cache.folder import kernel_folder
from streamhost.cache.kernel import in_use, remove

MAX_BYTES = 200_000_000
PRUNE_EVERY_SECONDS = 86_400.0
RECENT_SECONDS = 3_600.0
_OUR_FILE = re.compile(r"k_([0-9a-f]{32})\.")


def prune(max_bytes: int = MAX_BYTES) -> int:
    """Remove the least recently used kernels until the cache holds at most `max_bytes`; return the bytes removed.

    Kernels of this process stay whatever their age, and those used within the last hour, which another process may be
    at work with. (One that is removed all the same is only compiled again.)
    """
    folder = kernel_folder()
    return 0 if folder is None else _prune(folder.parent, max_bytes)


def prune_daily(base: Path) -> None:
    """Prune the cache under `base`, unless that has been done within a day; the stamp file `pruned` says when."""
    stamp = base / "pruned"
    with contextlib.suppress(OSError):
        if stamp.exists() and time.time() - stamp.stat().st_mtime < PRUNE_EVERY_SECONDS:
            return
        stamp.touch()
        _prune(base, MAX_BYTES)


@dataclass
class _Group:
    key: str
    files: list[Path] = field(default_factory=list)
    size: int = 0
    used: float = 0.0


def _prune(base: Path, max_bytes: int) -> int:
    groups = sorted(_groups(base), key=lambda group: group.used)
    excess = sum(group.size for group in groups) - max_bytes
    removed = 0
    for group in groups:
        if removed >= excess:
            break
        if group.key not in in_use and time.time() - group.used >= RECENT_SECONDS:
            remove(group.files)
            removed += group.size
    return removed


def _groups(base: Path) -> list[_Group]:
    """The files of each kernel, over every numba, Python and processor that has left some here."""
    groups: dict[tuple[str, str], _Group] = {}
    for file in [*base.glob("*/k_*"), *base.glob("*/__pycache__/k_*")]:
        if match := _OUR_FILE.match(file.name):
            with contextlib.suppress(OSError):
                status = file.stat()
                machine = file.relative_to(base).parts[0]
                group = groups.setdefault((machine, match[1]), _Group(match[1]))
                group.files.append(file)
                group.size += status.st_size
                group.used = max(group.used, status.st_mtime)
    return list(groups.values())
