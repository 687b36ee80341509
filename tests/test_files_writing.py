"""A written file holds exactly the codes that were asked for, in the container that fits."""

import os
import struct
import tempfile
import time
from fractions import Fraction
from pathlib import Path
from typing import Literal

import numpy as np
import pytest
from audio_files import noise, wav_codes, write
from hypothesis import given
from hypothesis import strategies as st

from streamhost.errors import AudioFileError
from streamhost.files import (
    AudioWriter,
    choose_container,
    probe,
    quantize,
    read_all,
    writing,
)

Pcm = Literal["pcm16", "pcm24", "pcm32"]
BITS = {"pcm16": 16, "pcm24": 24, "pcm32": 32}


# Codes


@pytest.mark.parametrize("subtype", ["pcm16", "pcm24", "pcm32"])
@given(data=st.data())
def test_codes_go_out_and_come_back_the_same(subtype: Pcm, data: st.DataObject) -> None:
    top = 2 ** (BITS[subtype] - 1)
    codes = data.draw(st.lists(st.integers(-top, top - 1), min_size=1, max_size=40)) + [-top, top - 1, 1, -1, 0]
    samples = np.array(codes, dtype=np.float64)[:, np.newaxis] / top
    with tempfile.TemporaryDirectory() as folder:
        writer = write(Path(folder) / "codes.wav", samples, subtype)
        assert wav_codes(Path(folder) / "codes.wav") == codes
        for name in ("codes.rf64", "codes.flac")[: 1 if subtype == "pcm32" else 2]:
            write(Path(folder) / name, samples, subtype)
            assert np.array_equal(read_all(Path(folder) / name)[0], samples)
    assert (writer.clipped, writer.frames) == (0, len(codes))


@given(st.lists(st.floats(width=32, allow_nan=False, allow_infinity=False), min_size=1, max_size=40))
def test_float_samples_of_32_bits_come_back_the_same(values: list[float]) -> None:
    samples = np.array(values)[:, np.newaxis]
    with tempfile.TemporaryDirectory() as folder:
        for name in ("values.wav", "values.rf64"):
            write(Path(folder) / name, samples, "float")
            back = read_all(Path(folder) / name)[0]
            assert back.tobytes() == samples.tobytes()  # so that minus zero counts too


@given(
    st.integers(2, 32).flatmap(
        lambda bits: st.tuples(
            st.just(bits),
            st.one_of(
                st.floats(-1.5, 1.5),
                st.integers(-(2 ** (bits + 1)), 2 ** (bits + 1)).map(lambda half: half / 2**bits),  # ties too
            ),
        )
    )
)
def test_rounding_is_to_the_nearest_code_ties_to_even_and_saturates(case: tuple[int, float]) -> None:
    bits, value = case
    nearest = round(Fraction(value) * 2 ** (bits - 1))  # Python rounds fractions half to even
    saturated = max(-(2 ** (bits - 1)), min(2 ** (bits - 1) - 1, nearest))
    codes, clipped = quantize(np.array([[value]]), bits)
    assert codes.tolist() == [[saturated]]
    assert clipped == (nearest != saturated)


def test_clipped_samples_are_counted_over_all_blocks(tmp_path: Path) -> None:
    step = 2.0**-15
    with AudioWriter(tmp_path / "hot.wav", rate=48000, channels=2, subtype="pcm16") as writer:
        writer.write(np.array([[1.0, -1.0], [1.0 - step, -1.0 - step]]))
        assert (writer.clipped, writer.frames) == (2, 2)
        writer.write(np.array([[1.0 - step / 2, -1.0 - step / 2], [7.0, 0.5]]))  # the ties go to even: 1.0 and -1.0
    assert (writer.clipped, writer.frames) == (4, 4)
    assert wav_codes(tmp_path / "hot.wav") == [32767, -32768, 32767, -32768, 32767, -32768, 32767, 16384]


def test_any_division_into_blocks_makes_the_same_bytes(tmp_path: Path) -> None:
    samples = noise(1000)
    for name, subtype in (("a.wav", "pcm24"), ("a.flac", "pcm16"), ("a.rf64", "float")):
        write(tmp_path / name, samples, subtype)  # type: ignore[arg-type]
        divided = tmp_path / f"divided{Path(name).suffix}"
        with AudioWriter(divided, rate=48000, channels=2, subtype=subtype) as writer:  # type: ignore[arg-type]
            for start in range(0, 1000, 7):
                writer.write(samples[start : start + 7])
        assert divided.read_bytes() == (tmp_path / name).read_bytes()


def test_samples_that_are_not_contiguous_are_written_in_their_order(tmp_path: Path) -> None:
    samples = np.arange(12.0).reshape(2, 6).T / 2**15
    for subtype in ("pcm16", "float"):
        write(tmp_path / f"{subtype}.wav", samples, subtype)  # type: ignore[arg-type]
        assert np.array_equal(read_all(tmp_path / f"{subtype}.wav")[0], samples)


def test_a_float_file_does_not_depend_on_the_time_of_day(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    write(tmp_path / "now.wav", noise(100), "float")
    content = (tmp_path / "now.wav").read_bytes()
    place = content.index(b"PEAK")
    size, version, seconds = struct.unpack_from("<III", content, place + 4)
    assert (size, version, seconds) == (8 + 2 * 8, 1, 0)  # two channels, eight bytes each
    monkeypatch.setattr(writing, "clear_peak_time", lambda stream: None)
    before = int(time.time())
    write(tmp_path / "stamped.wav", noise(100), "float")
    stamp = struct.unpack_from("<I", (tmp_path / "stamped.wav").read_bytes(), place + 12)[0]
    assert stamp >= before  # the library does stamp: the clearing above is needed


@pytest.mark.parametrize("bad", [np.nan, np.inf, -np.inf])
@pytest.mark.parametrize(("name", "subtype"), [("a.wav", "pcm16"), ("a.flac", "pcm24"), ("a.wav", "float")])
def test_a_sample_that_is_not_finite_is_refused(
    tmp_path: Path, bad: float, name: str, subtype: writing.Subtype
) -> None:
    block = np.zeros((10, 2))
    block[3, 1] = bad
    with (
        pytest.raises(AudioFileError, match=rf"frame 103, channel 2 is {bad}\."),
        AudioWriter(tmp_path / name, rate=48000, channels=2, subtype=subtype) as writer,
    ):
        writer.write(np.zeros((100, 2)))
        writer.write(block)
    assert list(tmp_path.iterdir()) == []


def test_a_sample_beyond_32_bit_floats_is_refused(tmp_path: Path) -> None:
    with pytest.raises(AudioFileError, match="frame 0, channel 1 is inf"):
        write(tmp_path / "a.wav", np.array([[1e39]]), "float")


# Kinds of file


def test_the_container_follows_the_extension_and_the_length() -> None:
    most = writing.WAV_LIMIT  # 2**32 - 2**20
    assert most == 4293918720
    assert choose_container("a.wav", "pcm16", 2, None) == "WAV"
    assert choose_container("a.WAV", "pcm16", 2, most // 4) == "WAV"
    assert choose_container("a.wav", "pcm16", 2, most // 4 + 1) == "RF64"
    assert choose_container("a.wav", "pcm24", 1, most // 3) == "WAV"
    assert choose_container("a.wav", "pcm24", 1, most // 3 + 1) == "RF64"
    assert choose_container("a.wav", "float", 64, most // 256) == "WAV"
    assert choose_container("a.wav", "float", 64, most // 256 + 1) == "RF64"
    assert choose_container("a.rf64", "pcm16", 2, 1) == "RF64"
    assert choose_container("a.flac", "pcm24", 2, most) == "FLAC"


def test_a_long_wav_is_rf64_inside(tmp_path: Path) -> None:
    write(tmp_path / "long.wav", noise(10), frames_expected=2**31)
    assert (tmp_path / "long.wav").read_bytes()[:4] == b"RF64"
    assert probe(tmp_path / "long.wav").frames == 10


def test_a_wav_that_outgrows_its_limit_unannounced_is_refused(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(writing, "WAV_LIMIT", 400)
    with AudioWriter(tmp_path / "just.wav", rate=48000, channels=2, subtype="pcm16") as writer:
        writer.write(noise(60))
        writer.write(noise(40))
    with (
        pytest.raises(AudioFileError, match=r"outgrows the 4 GiB of a WAV file at frame 60\. Name the file \.rf64"),
        AudioWriter(tmp_path / "over.wav", rate=48000, channels=2, subtype="pcm16") as writer,
    ):
        writer.write(noise(60))
        writer.write(noise(41))
    assert sorted(file.name for file in tmp_path.iterdir()) == ["just.wav"]


@pytest.mark.parametrize(
    ("name", "options", "reason"),
    [
        ("a.mp3", {}, r'not written as "\.mp3"\. Allowed extensions are \.wav, \.rf64, \.flac'),
        ("a.flca", {}, r'Did you mean "\.flac"\?'),
        ("a", {}, 'not written as ""'),
        ("a.wav", {"subtype": "pcm42"}, 'no sample format "pcm42". Allowed are pcm16, pcm24, pcm32, float'),
        ("a.flac", {"subtype": "float"}, "FLAC file does not hold float samples. Allowed are pcm16, pcm24"),
        ("a.flac", {"subtype": "pcm32"}, "FLAC file does not hold pcm32 samples"),
        ("a.flac", {"channels": 9}, "does not hold 9 channels. Allowed are 1 to 8"),
        ("a.wav", {"channels": 0}, "does not hold 0 channels. Allowed are 1 to 1024"),
        ("a.flac", {"rate": 655351}, "does not hold a rate of 655351 Hz. Allowed are 1 to 655350 Hz"),
        ("a.wav", {"rate": 0}, "does not hold a rate of 0 Hz"),
        ("none/a.wav", {}, "the folder .*none does not exist"),
        ("folder.wav", {}, "this is a folder"),
        ("pipe.wav", {"overwrite": True}, "a device or a pipe"),
        ("there.wav", {}, "this file exists"),
    ],
)
def test_requests_that_cannot_be_are_refused_before_any_work(
    tmp_path: Path, name: str, options: dict[str, object], reason: str
) -> None:
    (tmp_path / "folder.wav").mkdir()
    os.mkfifo(tmp_path / "pipe.wav")
    (tmp_path / "there.wav").write_text("precious")
    before = sorted(tmp_path.iterdir())
    asked: dict[str, object] = {"rate": 48000, "channels": 2, "subtype": "pcm16", **options}
    with pytest.raises(AudioFileError, match=reason) as caught, AudioWriter(tmp_path / name, **asked):  # type: ignore[arg-type]
        pytest.fail("work was begun")
    assert caught.value.exit_status == 2
    assert sorted(tmp_path.iterdir()) == before
    assert (tmp_path / "there.wav").read_text() == "precious"


@pytest.mark.parametrize(("channels", "rate"), [(1, 1), (8, 655350)])
def test_the_ends_of_what_flac_holds_are_written(tmp_path: Path, channels: int, rate: int) -> None:
    with AudioWriter(tmp_path / "a.flac", rate=rate, channels=channels, subtype="pcm24") as writer:
        writer.write(noise(100, channels))
    assert (probe(tmp_path / "a.flac").rate, probe(tmp_path / "a.flac").channels) == (rate, channels)


def test_a_block_of_another_shape_and_a_file_of_nothing_are_refused(tmp_path: Path) -> None:
    for shape in ((10,), (10, 1), (10, 3), (10, 2, 1)):
        with pytest.raises(AudioFileError, match=r"does not fit: \(frames, 2\) is needed"):  # noqa: SIM117
            with AudioWriter(tmp_path / "a.wav", rate=48000, channels=2, subtype="pcm16") as writer:
                writer.write(np.zeros(shape))
    for name in ("a.wav", "a.flac"):
        with pytest.raises(AudioFileError, match="no frame was written"):
            write(tmp_path / name, np.zeros((0, 2)))
    assert list(tmp_path.iterdir()) == []
