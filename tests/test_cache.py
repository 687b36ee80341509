"""The kernel cache: hits across processes, and every way in which files can fail it.

Most tests run child processes, since a cache shows only in the next one.
"""

import fcntl
import json
import linecache
import os
import signal
import stat
import subprocess
import sys
import threading
import time
from pathlib import Path
from typing import Any

import pytest

from streamhost import cache
from streamhost.cache import folder, kernel, loading, pruning

KERNEL = """
from numba import cfunc, float64

@cfunc(float64(float64), cache=CACHE)
def run(x):
    return 2.0 * x + 1.0
"""

CHILD = """
import json, sys
source = sys.stdin.read()
{before}
from streamhost import cache
module = cache.load_module(source, "test")
print(json.dumps({{"value": module.run.ctypes(3.0), "hits": module.run.cache_hits, "file": module.__file__,
                  "folder": str(cache.kernel_folder()), "notice": cache.notice(), "cached": module.CACHE}}))
"""


def start(base: Path, before: str = "", **environment: str) -> subprocess.Popen[str]:
    return subprocess.Popen(
        [sys.executable, "-c", CHILD.format(before=before)],
        stdin=subprocess.PIPE,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        env={**os.environ, "STREAMHOST_CACHE": str(base), **environment},
    )


def finish(child: subprocess.Popen[str]) -> dict[str, Any]:
    out, err = child.communicate()
    assert child.returncode == 0, err
    result: dict[str, Any] = json.loads(out)
    assert result["value"] == 7.0
    return result


def run_child(base: Path, source: str = KERNEL, before: str = "", **environment: str) -> dict[str, Any]:
    child = start(base, before, **environment)
    assert child.stdin is not None
    child.stdin.write(source)
    return finish(child)


def files_under(base: Path) -> dict[str, bytes]:
    return {str(path.relative_to(base)): path.read_bytes() for path in base.rglob("k_*")}


def only(base: Path, pattern: str) -> Path:
    (found,) = base.rglob(pattern)
    return found


@pytest.fixture
def here(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """The cache of this process, empty, for one test."""
    monkeypatch.setenv("STREAMHOST_CACHE", str(tmp_path / "cache"))
    monkeypatch.setattr(loading, "_modules", {})
    monkeypatch.setattr(kernel, "in_use", set())
    monkeypatch.setattr(loading, "in_use", kernel.in_use)
    monkeypatch.setattr(pruning, "in_use", kernel.in_use)
    monkeypatch.setattr(folder, "_notices", [])
    return tmp_path / "cache"


# --- the round trip


def test_second_process_takes_the_machine_code_from_disk(tmp_path: Path) -> None:
    first = run_child(tmp_path / "c")
    written = files_under(tmp_path / "c")
    second = run_child(tmp_path / "c")
    assert (first["hits"], second["hits"]) == (0, 1)
    assert files_under(tmp_path / "c") == written
    assert first["notice"] is second["notice"] is None
    assert Path(second["file"]).read_text() == KERNEL


def test_one_module_per_process_whichever_thread_asks(here: Path) -> None:
    ready = threading.Barrier(4)
    got = []

    def ask() -> None:
        ready.wait()
        got.append(cache.load_module(KERNEL, "test"))

    threads = [threading.Thread(target=ask) for _ in range(4)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert len(got) == 4
    assert all(module is got[0] for module in got)
    assert sys.modules[got[0].__name__] is got[0]


def test_other_text_is_another_kernel(here: Path) -> None:
    one = cache.load_module(KERNEL, "test")
    other = cache.load_module(KERNEL.replace("1.0", "5.0"), "test")
    assert (one.run.ctypes(3.0), other.run.ctypes(3.0)) == (7.0, 11.0)


def test_settings_of_numba_that_change_machine_code_make_another_kernel(tmp_path: Path) -> None:
    plain = run_child(tmp_path / "c")
    checked = run_child(tmp_path / "c", NUMBA_BOUNDSCHECK="1")
    assert plain["file"] != checked["file"]
    assert checked["hits"] == 0


def test_numba_is_kept_from_writing_elsewhere(tmp_path: Path) -> None:
    elsewhere = tmp_path / "elsewhere"
    elsewhere.mkdir()
    run_child(tmp_path / "c", NUMBA_CACHE_DIR=str(elsewhere))
    assert list(elsewhere.iterdir()) == []
    assert only(tmp_path / "c", "*.nbc").parent.name == "__pycache__"
    assert run_child(tmp_path / "c")["hits"] == 1


def test_import_needs_no_numba() -> None:
    code = "import sys, streamhost.cache; sys.exit(str(sorted({'numba', 'numpy', 'llvmlite'} & set(sys.modules))))"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True)
    assert done.stderr.strip() == "[]"


def test_a_mistake_in_the_text_comes_through(here: Path) -> None:
    for _ in range(2):  # and is not remembered as a module
        with pytest.raises(ZeroDivisionError):
            cache.load_module("1 // 0", "test")
    assert f"streamhost_kernel_{loading._key('1 // 0')}" not in sys.modules
    assert cache.notice() is None


# --- several processes at once


def test_processes_that_race_compile_once(tmp_path: Path) -> None:
    children = [start(tmp_path / "c") for _ in range(3)]
    for child in children:  # all have started and wait for the text
        assert child.stdin is not None
        child.stdin.write(KERNEL)
        child.stdin.close()
        child.stdin = None
    assert sorted(finish(child)["hits"] for child in children) == [0, 1, 1]


def test_a_process_killed_with_the_lock_in_its_hand_stops_nobody(tmp_path: Path) -> None:
    source = "import os, signal\nif 'DIE' in os.environ: os.kill(os.getpid(), signal.SIGKILL)\n" + KERNEL
    victim = start(tmp_path / "c", DIE="1")
    victim.communicate(source)
    assert victim.returncode == -signal.SIGKILL
    assert only(tmp_path / "c", "k_*.py").read_text() == source
    assert run_child(tmp_path / "c", source)["hits"] == 0


def test_a_lock_that_is_never_given_back_only_costs_the_wait(here: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(kernel, "LOCK_SECONDS", 0.05)
    own_folder = cache.kernel_folder()
    assert own_folder is not None
    text = kernel.Kernel(own_folder, loading._key(KERNEL)).text
    text.write_text(KERNEL)
    with text.open("rb") as held:
        fcntl.flock(held, fcntl.LOCK_EX)
        assert cache.load_module(KERNEL, "test").run.ctypes(3.0) == 7.0


# --- damaged files


def test_a_text_that_was_tampered_with_is_never_run(tmp_path: Path) -> None:
    first = run_child(tmp_path / "c")
    Path(first["file"]).write_text("raise SystemExit('this text must not run')")
    run_child(tmp_path / "c")
    assert Path(first["file"]).read_text() == KERNEL


@pytest.mark.parametrize("suffix", ["nbi", "nbc"])
@pytest.mark.parametrize("keep", [0, 100])
def test_a_compiled_file_cut_short_is_compiled_again(tmp_path: Path, suffix: str, keep: int) -> None:
    run_child(tmp_path / "c")
    file = only(tmp_path / "c", f"*.{suffix}")
    file.write_bytes(file.read_bytes()[:keep])
    again = run_child(tmp_path / "c")
    assert (again["hits"], again["notice"], again["cached"]) == (0, None, True)
    assert run_child(tmp_path / "c")["hits"] == 1


def test_machine_code_with_a_flipped_bit_is_not_believed(tmp_path: Path) -> None:
    run_child(tmp_path / "c")
    file = only(tmp_path / "c", "*.nbc")
    content = bytearray(file.read_bytes())
    content[len(content) // 2] ^= 0x10
    file.write_bytes(content)
    assert run_child(tmp_path / "c")["hits"] == 0


def test_a_sealed_file_that_cannot_be_read_is_compiled_again(tmp_path: Path) -> None:
    first = run_child(tmp_path / "c")
    file = only(tmp_path / "c", "*.nbc")
    file.write_bytes(file.read_bytes()[:100])
    damaged = kernel.Kernel(Path(first["folder"]), Path(first["file"]).stem.removeprefix("k_"))
    damaged.put_seal()
    assert damaged.is_sealed()
    again = run_child(tmp_path / "c")
    assert (again["hits"], again["notice"]) == (0, None)
    assert run_child(tmp_path / "c")["hits"] == 1


def test_a_disk_that_fills_up_costs_the_cache_and_nothing_else(tmp_path: Path) -> None:
    before = """
import errno
from numba.core.caching import IndexDataCacheFile
def full(*args): raise OSError(errno.ENOSPC, "No space left on device")
IndexDataCacheFile._save_data = full
"""
    full = run_child(tmp_path / "c", before=before)
    assert full["cached"] is False
    assert "No space left on device" in full["notice"]
    assert run_child(tmp_path / "c")["notice"] is None


# --- the folder


def test_only_the_user_can_enter_the_folder(here: Path) -> None:
    own_folder = cache.kernel_folder()
    assert own_folder is not None
    assert own_folder.parent == here
    for each in (here, own_folder, own_folder / "__pycache__"):
        assert stat.S_IMODE(each.stat().st_mode) == 0o700


def test_an_unusable_folder_is_replaced_for_the_run_and_said(tmp_path: Path) -> None:
    blocker = tmp_path / "file"
    blocker.write_text("a file, so that no folder can be made below it, whoever asks")
    result = run_child(blocker / "cache")
    assert "Compiled kernels are kept for this run only" in result["notice"]
    assert str(blocker) in result["notice"]
    assert "STREAMHOST_CACHE" in result["notice"]
    assert not Path(result["folder"]).exists()
    assert blocker.is_file()


def test_without_any_folder_kernels_still_compile(tmp_path: Path) -> None:
    blocker = tmp_path / "file"
    blocker.write_text("")
    result = run_child(blocker / "cache", before=f"import tempfile; tempfile.tempdir = {str(blocker)!r}")
    assert result["folder"] == "None"
    assert result["cached"] is False
    assert "not kept at all" in result["notice"]


def test_text_in_memory_can_be_shown_in_a_traceback(here: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(loading, "kernel_folder", lambda: None)
    module = cache.load_module(KERNEL, "peak")
    assert linecache.getline(str(module.__file__), 5) == "def run(x):\n"
    assert "peak" in str(module.__file__)


@pytest.mark.parametrize("mode", [0o770, 0o707, 0o777])
def test_a_folder_that_others_can_write_to_is_refused(here: Path, mode: int) -> None:
    here.mkdir()
    here.chmod(mode)
    own_folder = cache.kernel_folder()
    assert own_folder is not None
    assert here not in own_folder.parents
    assert "others can write" in str(cache.notice())


def test_a_folder_of_another_user_is_refused(here: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    here.mkdir(mode=0o700)
    us = os.getuid()
    monkeypatch.setattr(os, "getuid", lambda: us + 1)
    with pytest.raises(PermissionError, match="belongs to another user"):
        folder._private_folders(here)


def test_where_the_folder_lies(here: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    assert folder._wanted_folder() == here
    monkeypatch.delenv("STREAMHOST_CACHE")
    monkeypatch.setenv("XDG_CACHE_HOME", str(tmp_path / "xdg"))
    assert folder._wanted_folder() == tmp_path / "xdg" / "streamhost"
    monkeypatch.setenv("HOME", str(tmp_path / "home"))
    monkeypatch.setenv("XDG_CACHE_HOME", "relative")
    assert folder._wanted_folder() == tmp_path / "home" / ".cache" / "streamhost"
    monkeypatch.delenv("XDG_CACHE_HOME")
    assert folder._wanted_folder() == tmp_path / "home" / ".cache" / "streamhost"


# --- pruning


def make_kernel(base: Path, digit: str, size: int, hours_ago: float) -> list[Path]:
    """Files like those of a kernel of some other machine, last used so long ago."""
    base.mkdir(mode=0o700, exist_ok=True)
    name = f"k_{digit * 32}"
    files = [base / "other" / f"{name}.py", base / "other" / "__pycache__" / f"{name}.run-5.py311.1.nbc"]
    for file in files:
        file.parent.mkdir(parents=True, exist_ok=True)
        file.write_bytes(bytes(size // 2))
        os.utime(file, (time.time() - 3600 * hours_ago,) * 2)
    return files


def test_prune_removes_the_least_recently_used(here: Path) -> None:
    oldest = make_kernel(here, "a", 1000, hours_ago=30)
    older = make_kernel(here, "b", 1000, hours_ago=20)
    old = make_kernel(here, "c", 1000, hours_ago=10)
    assert cache.prune(max_bytes=3000) == 0
    assert cache.prune(max_bytes=1500) == 2000
    assert not any(file.exists() for file in oldest + older)
    assert all(file.exists() for file in old)


def test_prune_counts_a_kernel_as_used_when_any_of_its_files_was(here: Path) -> None:
    touched = make_kernel(here, "a", 1000, hours_ago=30)
    untouched = make_kernel(here, "b", 1000, hours_ago=20)
    os.utime(touched[1], (time.time() - 3600 * 5,) * 2)
    assert cache.prune(max_bytes=1000) == 1000
    assert all(file.exists() for file in touched)
    assert not any(file.exists() for file in untouched)


def test_prune_leaves_what_is_in_use_and_what_is_not_ours(here: Path) -> None:
    make_kernel(here, "a", 1000, hours_ago=0.5)  # perhaps another process is at work with it
    foreign = [here / "other" / "k_notes.txt", here / "k_sheet.ods"]
    for file in foreign:
        file.write_text("not a kernel")
        os.utime(file, (0, 0))
    cache.load_module(KERNEL, "test")
    for file in here.rglob(f"k_{loading._key(KERNEL)}*"):
        os.utime(file, (0, 0))
    before = files_under(here)
    assert cache.prune(max_bytes=0) == 0
    assert files_under(here) == before


def test_loading_marks_a_kernel_as_used(tmp_path: Path) -> None:
    run_child(tmp_path / "c")
    for file in (tmp_path / "c").rglob("k_*"):
        os.utime(file, (0, 0))
    assert run_child(tmp_path / "c")["hits"] == 1
    assert [file.suffix for file in (tmp_path / "c").rglob("k_*") if file.stat().st_mtime > 0] == [".seal"]


def test_loading_prunes_once_a_day(here: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(pruning, "MAX_BYTES", 0)
    first = make_kernel(here, "a", 1000, hours_ago=30)
    cache.load_module(KERNEL, "test")
    assert not any(file.exists() for file in first)
    second = make_kernel(here, "b", 1000, hours_ago=30)
    cache.load_module(KERNEL + "# another\n", "test")
    assert all(file.exists() for file in second)
    yesterday = time.time() - 1.01 * pruning.PRUNE_EVERY_SECONDS
    os.utime(here / "pruned", (yesterday, yesterday))
    cache.load_module(KERNEL + "# a third\n", "test")
    assert not any(file.exists() for file in second)
