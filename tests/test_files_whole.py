"""A file that is written is there whole or not at all, whatever fails in the middle."""

import errno
import os
import signal
import subprocess
import tempfile
from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pytest
from audio_files import file_size_limit, no_privileges, noise, wav_codes, write

from streamhost.errors import AudioFileError, MachineError, RequestError
from streamhost.files import AudioWriter, atomic, same_file, sink, write_bytes_atomic, write_text_atomic, writing


class OtherError(Exception):
    pass


@pytest.mark.parametrize("name", ["a.wav", "a.rf64", "a.flac"])
@pytest.mark.parametrize("overwrite", [False, True])
def test_an_error_in_the_middle_leaves_nothing_and_what_was_there(tmp_path: Path, name: str, overwrite: bool) -> None:
    if overwrite:
        (tmp_path / name).write_text("precious")
    for error in (OtherError, KeyboardInterrupt, SystemExit):
        with (
            pytest.raises(error),
            AudioWriter(tmp_path / name, rate=48000, channels=2, subtype="pcm16", overwrite=overwrite) as writer,
        ):
            writer.write(noise(10000))
            partial = f".{name}.partial-{os.getpid()}"
            assert partial in [file.name for file in tmp_path.iterdir()]
            raise error
        assert [file.name for file in tmp_path.iterdir()] == ([name] if overwrite else [])
    if overwrite:
        assert (tmp_path / name).read_text() == "precious"


def test_control_c_in_the_middle_leaves_nothing(tmp_path: Path) -> None:
    with (
        pytest.raises(KeyboardInterrupt),
        AudioWriter(tmp_path / "a.wav", rate=48000, channels=2, subtype="pcm16") as writer,
    ):
        writer.write(noise(10000))
        signal.raise_signal(signal.SIGINT)
    assert list(tmp_path.iterdir()) == []


def test_control_c_inside_the_audio_librarys_writing_is_not_lost(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def interrupt(stream: object, data: bytes) -> None:
        signal.raise_signal(signal.SIGINT)

    with (
        pytest.raises(KeyboardInterrupt),
        AudioWriter(tmp_path / "a.wav", rate=48000, channels=2, subtype="pcm16") as writer,
    ):
        monkeypatch.setattr(sink, "write_fully", interrupt)
        writer.write(noise(10000))
    assert list(tmp_path.iterdir()) == []


def test_an_error_that_the_caller_swallows_does_not_publish_the_file(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def fail(stream: object, data: bytes) -> None:
        raise OSError(errno.EIO, os.strerror(errno.EIO))

    with (
        pytest.raises(MachineError, match="Input/output error"),
        AudioWriter(tmp_path / "a.wav", rate=48000, channels=2, subtype="pcm16") as writer,
    ):
        writer.write(noise(10))
        with monkeypatch.context() as patch:
            patch.setattr(sink, "write_fully", fail)
            with pytest.raises(MachineError, match="Input/output error"):
                writer.write(noise(10000))
        writer_frames = writer.frames
    assert writer_frames == 10
    assert list(tmp_path.iterdir()) == []


def test_a_header_that_did_not_arrive_is_noticed(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(writing, "clear_peak_time", lambda stream: stream.truncate(60))
    with pytest.raises(MachineError, match="100 frames were written and 0 arrived"):
        write(tmp_path / "a.wav", noise(100))
    assert list(tmp_path.iterdir()) == []


def test_the_file_is_not_seen_before_it_is_whole_and_then_replaces_the_old_one(tmp_path: Path) -> None:
    path = tmp_path / "a.wav"
    path.write_text("old")
    with AudioWriter(path, rate=48000, channels=1, subtype="pcm16", overwrite=True) as writer:
        writer.write(np.full((3, 1), 0.5))
        assert path.read_text() == "old"
    assert wav_codes(path) == [16384] * 3
    assert list(tmp_path.iterdir()) == [path]


@pytest.mark.parametrize("links", [True, False])
def test_a_file_that_appears_meanwhile_is_not_overwritten(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, links: bool
) -> None:
    if not links:  # as on a memory stick
        monkeypatch.setattr(os, "link", raise_no_links)
    path = tmp_path / "a.wav"
    with (
        pytest.raises(AudioFileError, match="this file exists"),
        AudioWriter(path, rate=48000, channels=1, subtype="pcm16") as writer,
    ):
        writer.write(np.zeros((3, 1)))
        path.write_text("precious")
    assert path.read_text() == "precious"
    assert list(tmp_path.iterdir()) == [path]


def raise_no_links(*args: object, **options: object) -> None:
    raise OSError(errno.EPERM, os.strerror(errno.EPERM))


def test_a_disk_without_hard_links_is_written(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(os, "link", raise_no_links)
    write(tmp_path / "a.wav", np.zeros((3, 1)))
    assert list(tmp_path.iterdir()) == [tmp_path / "a.wav"]


def test_through_a_link_the_file_that_it_leads_to_is_written(tmp_path: Path) -> None:
    (tmp_path / "there").mkdir()
    (tmp_path / "link.wav").symlink_to("there/a.wav")
    write(tmp_path / "link.wav", np.full((1, 1), 0.5))
    assert (tmp_path / "link.wav").is_symlink()
    assert wav_codes(tmp_path / "there" / "a.wav") == [16384]


def test_what_a_killed_process_of_our_number_left_is_no_hindrance(tmp_path: Path) -> None:
    (tmp_path / f".a.wav.partial-{os.getpid()}").write_text("left over" * 1000)
    write(tmp_path / "a.wav", np.full((1, 1), 0.5))
    assert wav_codes(tmp_path / "a.wav") == [16384]
    assert list(tmp_path.iterdir()) == [tmp_path / "a.wav"]


def test_a_new_file_has_the_permissions_of_any_new_file(tmp_path: Path) -> None:
    write(tmp_path / "a.wav", np.zeros((1, 1)))
    (tmp_path / "other").touch()
    assert (tmp_path / "a.wav").stat().st_mode == (tmp_path / "other").stat().st_mode


# Failures of the machine


@pytest.mark.parametrize(("name", "subtype"), [("a.wav", "pcm16"), ("a.rf64", "pcm24"), ("a.flac", "pcm16")])
def test_wherever_the_room_ends_the_file_is_whole_or_not_there(
    tmp_path: Path, name: str, subtype: writing.Subtype
) -> None:
    samples = noise(3000)
    path = tmp_path / name
    write(path, samples, subtype)
    whole = path.read_bytes()
    path.unlink()
    # The first bytes, all about the end (where errors come only when the library closes), and places between.
    limits = sorted({0, 1, 30, 44, 100, *range(997, len(whole), 997), *range(len(whole) - 20, len(whole) + 2)})
    for limit in limits:
        if limit >= len(whole):
            with file_size_limit(limit):
                write(path, samples, subtype)
            assert path.read_bytes() == whole
            path.unlink()
        else:
            with file_size_limit(limit), pytest.raises(MachineError, match="cannot write this file: File too large"):
                write(path, samples, subtype)
        assert list(tmp_path.iterdir()) == []


@pytest.fixture
def small_disk(tmp_path: Path) -> Iterator[Path]:
    """A disk of 64 kB. Only root can make one; the test before this one needs no root and asks for more."""
    disk = tmp_path / "disk"
    disk.mkdir()
    mount = ["mount", "-t", "tmpfs", "-o", "size=64k", "tmpfs", str(disk)]
    if os.geteuid() != 0 or subprocess.run(mount, capture_output=True).returncode != 0:
        pytest.skip("no right to mount a small disk here")
    yield disk
    subprocess.run(["umount", str(disk)], check=True)


@pytest.mark.parametrize(("name", "subtype"), [("a.wav", "pcm16"), ("a.rf64", "float"), ("a.flac", "pcm24")])
def test_a_full_disk_is_the_machines_failure(small_disk: Path, name: str, subtype: writing.Subtype) -> None:
    with pytest.raises(MachineError, match=r"No space left on device\. Free some space") as caught:
        write(small_disk / name, noise(100000), subtype)
    assert caught.value.exit_status == 3
    assert list(small_disk.iterdir()) == []
    with pytest.raises(MachineError, match="No space left on device"):
        write_text_atomic(small_disk / "a.json", "x" * 100000)
    assert list(small_disk.iterdir()) == []
    write(small_disk / name, noise(100), subtype)


def test_a_folder_that_may_not_be_written_is_the_machines_failure() -> None:
    with tempfile.TemporaryDirectory() as folder:  # pytest's own folder is closed to others
        Path(folder).chmod(0o555)
        with no_privileges(), pytest.raises(MachineError, match=r"Permission denied\. Choose a place") as caught:
            write(Path(folder) / "a.wav", noise(10))
        Path(folder).chmod(0o755)
        assert caught.value.exit_status == 3
        assert list(Path(folder).iterdir()) == []


def test_the_disk_failing_to_settle_is_the_machines_failure(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def fail(descriptor: int) -> None:
        raise OSError(errno.EIO, os.strerror(errno.EIO))

    monkeypatch.setattr(os, "fsync", fail)
    with pytest.raises(MachineError, match="Input/output error"):
        write(tmp_path / "a.wav", noise(10))
    assert list(tmp_path.iterdir()) == []


def test_a_name_that_is_too_long_is_the_machines_failure(tmp_path: Path) -> None:
    with pytest.raises(MachineError, match="Choose a shorter file name"):
        write(tmp_path / ("a" * 300 + ".wav"), noise(10))


# Other files


def test_text_and_bytes_are_written_as_they_are(tmp_path: Path) -> None:
    write_text_atomic(tmp_path / "a.json", "−3 dB\n\r\n")
    assert (tmp_path / "a.json").read_bytes() == "−3 dB\n\r\n".encode()
    write_bytes_atomic(tmp_path / "b", b"\x00\xff")
    assert (tmp_path / "b").read_bytes() == b"\x00\xff"
    write_bytes_atomic(tmp_path / "empty", b"")
    assert (tmp_path / "empty").read_bytes() == b""
    with pytest.raises(RequestError, match="this file exists"):
        write_text_atomic(tmp_path / "a.json", "other")
    write_text_atomic(tmp_path / "a.json", "other", overwrite=True)
    assert (tmp_path / "a.json").read_text() == "other"
    assert sorted(file.name for file in tmp_path.iterdir()) == ["a.json", "b", "empty"]


def test_text_that_finds_no_room_leaves_what_was_there(tmp_path: Path) -> None:
    (tmp_path / "a.svg").write_text("precious")
    with file_size_limit(1000), pytest.raises(MachineError, match="File too large"):
        write_text_atomic(tmp_path / "a.svg", "x" * 1001, overwrite=True)
    assert (tmp_path / "a.svg").read_text() == "precious"
    assert list(tmp_path.iterdir()) == [tmp_path / "a.svg"]


def test_a_write_that_takes_only_a_part_is_continued(tmp_path: Path) -> None:
    class Reluctant:
        taken = b""

        def write(self, data: memoryview) -> int:
            self.taken += bytes(data[:3])
            return len(data[:3])

    file = Reluctant()
    atomic.write_fully(file, b"0123456789")  # type: ignore[arg-type]
    assert file.taken == b"0123456789"


def test_same_file_sees_through_links_and_spellings(tmp_path: Path) -> None:
    (tmp_path / "a.wav").touch()
    (tmp_path / "copy.wav").touch()
    (tmp_path / "soft.wav").symlink_to("a.wav")
    (tmp_path / "hard.wav").hardlink_to(tmp_path / "a.wav")
    (tmp_path / "folder").mkdir()
    for name in ("a.wav", "soft.wav", "hard.wav", "folder/../a.wav"):
        assert same_file(tmp_path / "a.wav", tmp_path / name)
    assert not same_file(tmp_path / "a.wav", tmp_path / "copy.wav")
    assert not same_file(tmp_path / "a.wav", tmp_path / "missing.wav")
    assert same_file(tmp_path / "missing.wav", tmp_path / "folder" / ".." / "missing.wav")
