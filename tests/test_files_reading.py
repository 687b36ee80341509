"""Whole files arrive exactly; anything else is refused with its reason."""

import os
import struct
import tempfile
import wave
from pathlib import Path

import numpy as np
import pytest
import soundfile
from audio_files import no_privileges, wav_bytes
from hypothesis import given
from hypothesis import strategies as st

from streamhost.errors import AudioFileError, MachineError
from streamhost.files import AudioInfo, probe, probing, read_all, read_blocks


def noise_file(path: Path, container: str, subtype: str, frames: int = 20000, channels: int = 2) -> None:
    codes = np.random.default_rng(1).integers(-(2**31), 2**31, (frames, channels), dtype=np.int32)
    samples = codes if subtype.startswith("PCM") else codes / 2.0**31
    soundfile.write(path, samples, 44100, format=container, subtype=subtype)


@pytest.mark.parametrize("bits", [16, 24, 32])
@given(data=st.data())
def test_every_code_arrives_exactly(bits: int, data: st.DataObject) -> None:
    top = 2 ** (bits - 1)
    codes = data.draw(st.lists(st.integers(-top, top - 1), min_size=1, max_size=40)) + [-top, top - 1, 1, -1, 0]
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "codes.wav"
        path.write_bytes(wav_bytes(codes, bits))
        samples, info = read_all(path)
    assert samples.dtype == np.float64
    assert samples[:, 0].tolist() == [code / top for code in codes]
    assert info == AudioInfo(path, 48000, 1, len(codes), f"PCM_{bits}", "WAV")


@pytest.mark.parametrize(
    ("container", "subtype"),
    [
        ("WAV", "PCM_U8"), ("WAV", "PCM_16"), ("WAV", "FLOAT"), ("WAV", "DOUBLE"), ("WAVEX", "PCM_24"),
        ("RF64", "PCM_16"), ("RF64", "FLOAT"), ("W64", "PCM_24"), ("FLAC", "PCM_16"), ("FLAC", "PCM_24"),
        ("AIFF", "PCM_16"), ("AIFF", "PCM_24"), ("AIFF", "PCM_32"), ("AIFF", "FLOAT"),
    ],
)  # fmt: skip
def test_blocks_of_any_length_make_up_the_file(tmp_path: Path, container: str, subtype: str) -> None:
    path = tmp_path / "noise"  # no extension: the content decides
    noise_file(path, container, subtype, frames=1000)
    whole, info = read_all(path)
    expected = np.random.default_rng(1).integers(-(2**31), 2**31, (1000, 2), dtype=np.int32) / 2.0**31
    bits = {"PCM_U8": 8, "PCM_16": 16, "PCM_24": 24, "PCM_32": 32, "FLOAT": 24, "DOUBLE": 32}[subtype]
    # One step of the word: the library that made the file may have rounded up or down.
    assert np.max(np.abs(whole - expected)) <= 2.0 ** (1 - bits)
    assert (info.rate, info.channels, info.frames, info.subtype, info.container) == (44100, 2, 1000, subtype, container)
    for frames in (1, 7, 999, 1000, 4096):
        blocks = [block.copy() for block in read_blocks(path, frames)]
        assert all(len(block) == frames for block in blocks[:-1])
        assert np.array_equal(np.concatenate(blocks), whole)


def test_blocks_are_two_dimensional_and_share_their_memory(tmp_path: Path) -> None:
    (tmp_path / "mono.wav").write_bytes(wav_bytes([1, 2, 3, 4], 16))
    blocks = list(read_blocks(tmp_path / "mono.wav", 2))
    assert [block.shape for block in blocks] == [(2, 1), (2, 1)]
    assert np.shares_memory(blocks[0], blocks[1])


@pytest.mark.parametrize(
    ("container", "subtype"),
    [
        ("WAV", "PCM_16"), ("WAVEX", "PCM_24"), ("WAV", "FLOAT"), ("RF64", "PCM_24"), ("W64", "PCM_16"),
        ("AIFF", "PCM_24"), ("AIFF", "FLOAT"), ("FLAC", "PCM_16"), ("FLAC", "PCM_24"),
    ],
)  # fmt: skip
@pytest.mark.parametrize("kept", ["all but one byte", "nine tenths", "half", "a tenth"])
def test_a_truncated_file_is_refused_with_both_counts(tmp_path: Path, container: str, subtype: str, kept: str) -> None:
    path = tmp_path / "cut"
    noise_file(path, container, subtype)
    whole = path.read_bytes()
    share = {"all but one byte": len(whole) - 1, "nine tenths": len(whole) * 9 // 10, "half": len(whole) // 2}
    path.write_bytes(whole[: share.get(kept, len(whole) // 10)])
    with pytest.raises(AudioFileError, match="truncated") as caught:
        probe(path)
    words = str(caught.value).split()
    promised, present = int(words[words.index("promises") + 1]), int(words[words.index("can") - 1])
    assert promised == 20000
    assert 0 <= present < 20000
    if container != "FLAC":  # FLAC's frames have no fixed size; elsewhere the header is all that is not audio
        audio_bytes = path.stat().st_size / (2 * {"PCM_16": 2, "PCM_24": 3, "FLOAT": 4}[subtype])
        assert 0 <= audio_bytes - present < 60  # frames of 4 bytes or more: headers of at most 240 bytes
    with pytest.raises(AudioFileError, match="truncated"):
        read_blocks(path)


def test_a_flac_file_damaged_in_the_middle_is_refused_while_reading(tmp_path: Path) -> None:
    path = tmp_path / "damaged.flac"
    noise_file(path, "FLAC", "PCM_16", frames=50000)
    content = bytearray(path.read_bytes())
    content[len(content) // 2 : len(content) // 2 + 2000] = bytes(2000)
    path.write_bytes(content)
    with pytest.raises(AudioFileError, match="truncated or damaged: its header promises 50000 frames"):
        list(read_blocks(path))


def test_a_file_that_shrinks_while_it_is_read_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "shrinks.wav"
    noise_file(path, "WAV", "PCM_16", frames=100000)
    blocks = read_blocks(path, 1000)
    next(blocks)
    os.truncate(path, 44 + 50000 * 4)
    with pytest.raises(AudioFileError, match="promises 100000 frames, 50000 can be read"):
        list(blocks)


@pytest.mark.parametrize("bad", [np.nan, np.inf, -np.inf])
def test_a_sample_that_is_not_finite_is_named_by_frame_and_channel(tmp_path: Path, bad: float) -> None:
    samples = np.zeros((5000, 2), dtype=np.float32)
    samples[4321, 1] = bad
    soundfile.write(tmp_path / "bad.wav", samples, 48000, subtype="FLOAT")
    blocks = read_blocks(tmp_path / "bad.wav", 1000)
    for _ in range(4):
        next(blocks)
    with pytest.raises(AudioFileError, match=rf"bad\.wav: frame 4321, channel 2 is {bad}\."):
        next(blocks)
    with pytest.raises(AudioFileError, match="frame 4321"):
        read_all(tmp_path / "bad.wav")


def test_what_is_no_audio_file_is_refused_with_its_reason(tmp_path: Path) -> None:
    (tmp_path / "text.wav").write_text("Not audio at all, although it is called so.\n" * 10)
    (tmp_path / "empty.wav").touch()
    (tmp_path / "folder.wav").mkdir()
    (tmp_path / "samples.raw").write_bytes(bytes(1000))
    (tmp_path / "header.wav").write_bytes(wav_bytes([1, 2, 3], 16)[:30])
    os.mkfifo(tmp_path / "pipe.wav")
    reasons = {
        "missing.wav": "there is no such file",
        "text.wav/inside.wav": "there is no such file",
        "text.wav": "no audio file, or its header is damaged",
        "empty.wav": r"empty \(0 bytes\)",
        "folder.wav": "this is a folder",
        "samples.raw": "no audio file, or its header is damaged",
        "header.wav": "no audio file, or its header is damaged",
        "pipe.wav": "a device or a pipe",
    }
    for name, reason in reasons.items():
        with pytest.raises(AudioFileError, match=reason) as caught:
            probe(tmp_path / name)
        assert str(caught.value).startswith(str(tmp_path / name))
        assert "\n" not in str(caught.value)
        assert caught.value.exit_status == 2


def test_a_file_without_a_frame_is_refused(tmp_path: Path) -> None:
    (tmp_path / "none.wav").write_bytes(wav_bytes([], 16))
    soundfile.write(tmp_path / "none.aiff", np.zeros((0, 1)), 48000, subtype="PCM_16")
    # A recorder that was killed leaves its audio under a header that says 0.
    (tmp_path / "killed.wav").write_bytes(wav_bytes([1, 2, 3], 16, data_size=0))
    for name in ("none.wav", "none.aiff", "killed.wav"):
        with pytest.raises(AudioFileError, match="header says 0 frames"):
            probe(tmp_path / name)


@pytest.mark.parametrize(
    ("container", "subtype"), [("OGG", "VORBIS"), ("WAV", "ULAW"), ("WAV", "IMA_ADPCM"), ("CAF", "PCM_16")]
)
def test_kinds_whose_wholeness_or_codes_cannot_be_trusted_are_refused(
    tmp_path: Path, container: str, subtype: str
) -> None:
    soundfile.write(tmp_path / "other", np.zeros((1000, 1)), 48000, format=container, subtype=subtype)
    with pytest.raises(AudioFileError, match=f"{container} with {subtype} samples is not read"):
        probe(tmp_path / "other")


def test_a_wav_of_unknown_length_runs_to_the_end_of_the_file(tmp_path: Path) -> None:
    (tmp_path / "pipe.wav").write_bytes(wav_bytes([5, 6, 7], 16, data_size=2**32 - 1))
    assert read_all(tmp_path / "pipe.wav")[0][:, 0].tolist() == [5 / 2**15, 6 / 2**15, 7 / 2**15]


def test_a_flac_of_unknown_length_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "stream.flac"
    noise_file(path, "FLAC", "PCM_16")
    content = bytearray(path.read_bytes())
    content[21] &= 0xF0  # the number of frames: the low half of byte 21 and the four bytes after it
    content[22:26] = bytes(4)
    path.write_bytes(content)
    with pytest.raises(AudioFileError, match="does not say how many frames"):
        probe(path)


def test_a_wav_file_longer_than_its_header_can_say_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "huge.wav"
    path.write_bytes(wav_bytes([1, 2, 3], 16))
    os.truncate(path, 2**32 + 2**21)  # a sparse file: it takes no room on the disk
    with pytest.raises(AudioFileError, match="cannot state more than 4 GiB"):
        probe(path)


def test_a_chunk_before_the_audio_is_walked_over_and_one_behind_it_is_no_audio(tmp_path: Path) -> None:
    whole = wav_bytes([1, 2, 3], 16)
    odd = struct.pack("<4sI", b"note", 5) + b"12345\0"
    (tmp_path / "notes.wav").write_bytes(whole[:12] + odd + whole[12:] + odd)
    assert read_all(tmp_path / "notes.wav")[0][:, 0].tolist() == [1 / 2**15, 2 / 2**15, 3 / 2**15]


def test_a_wav_of_the_other_byte_order_is_read_and_its_truncation_seen(tmp_path: Path) -> None:
    path = tmp_path / "big.wav"
    soundfile.write(path, np.array([[0.5], [-0.25]]), 48000, subtype="PCM_16", endian="BIG")
    whole = path.read_bytes()
    assert whole[:4] == b"RIFX"
    assert read_all(path)[0].tolist() == [[0.5], [-0.25]]
    path.write_bytes(whole[:-1])
    with pytest.raises(AudioFileError, match="promises 2 frames, 1 can be read"):
        probe(path)


def test_a_file_whose_audio_only_the_library_finds_is_refused(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    # No such file is known to us; one may come with another version of the library.
    monkeypatch.setattr(probing, "find_audio", lambda path: None)
    (tmp_path / "strange.wav").write_bytes(wav_bytes([1, 2, 3], 16))
    with pytest.raises(AudioFileError, match="does not lead to its audio"):
        probe(tmp_path / "strange.wav")
    noise_file(tmp_path / "usual.flac", "FLAC", "PCM_16", frames=10)  # which is decoded to its end instead
    assert probe(tmp_path / "usual.flac").frames == 10


def test_agrees_with_the_standard_library_on_a_stereo_file(tmp_path: Path) -> None:
    with wave.open(str(tmp_path / "stereo.wav"), "wb") as file:
        file.setparams((2, 2, 32000, 0, "NONE", ""))
        file.writeframes(struct.pack("<6h", 1, -1, 2, -2, 32767, -32768))
    samples, info = read_all(tmp_path / "stereo.wav")
    assert (samples * 2**15).tolist() == [[1, -1], [2, -2], [32767, -32768]]
    assert (info.rate, info.channels) == (32000, 2)
    assert info.seconds == 3 / 32000


def test_a_name_that_is_no_text_is_read(tmp_path: Path) -> None:
    path = Path(os.fsdecode(os.fsencode(tmp_path) + b"/\xff\xfe.wav"))
    path.write_bytes(wav_bytes([1], 16))
    assert probe(path).frames == 1


def test_a_file_that_may_not_be_read_is_the_machines_failure() -> None:
    with tempfile.TemporaryDirectory() as folder:  # pytest's own folder is closed to others
        Path(folder).chmod(0o755)
        path = Path(folder) / "closed.wav"
        path.write_bytes(wav_bytes([1], 16))
        path.chmod(0)
        with no_privileges(), pytest.raises(MachineError, match="cannot read this file: Permission denied") as caught:
            probe(path)
        assert caught.value.exit_status == 3


def test_blocks_have_at_least_one_frame(tmp_path: Path) -> None:
    (tmp_path / "mono.wav").write_bytes(wav_bytes([1], 16))
    with pytest.raises(AudioFileError, match="blocks of 0 frames"):
        read_blocks(tmp_path / "mono.wav", 0)
