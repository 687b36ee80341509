"""The recordings that ship are made by their script to the last bit, are what they are said to be, and are found."""

import hashlib
import importlib.util
import itertools
import wave
from pathlib import Path
from types import ModuleType

import numpy as np
import pytest

from streamhost import shipped
from streamhost.errors import AudioFileError, PresetError
from streamhost.files import probe, read_all

DIGESTS = {  # of the codes; a recording is changed knowingly or not at all
    "plucked.wav": "da453902a977ac4986487788961e09e0e7b1cc1eab41fbb13684317ac4caca86",
    "chord.wav": "eacfbbcfe224ac8d7a68eed498408c660d02e8c8fd7cf5f41eb41de6c81c9f3a",
    "drums.wav": "487e212826dba90b27e10f84f9686299701d88a91785d7d104550cf24ecff77b",
    "speech.wav": "47a9df6d3b683cd759ef014f5964c322a34d071f8454ad17243a7375d6310a95",
}
RATE = 48000


def script() -> ModuleType:
    spec = importlib.util.spec_from_file_location("make_samples", shipped.folder("sample") / "make.py")
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


def codes(name: str) -> np.ndarray:
    return (read_all(shipped.resolve(name, "sample"))[0] * 2**15).astype(np.int16)


def dbfs(value: float) -> float:
    return float(20 * np.log10(value))


def test_the_script_makes_the_same_bytes_again(tmp_path: Path) -> None:
    make = script()
    made = make.recordings()
    assert made.keys() == DIGESTS.keys()
    for name, again in made.items():
        assert np.array_equal(again, codes(name))  # not one code may differ
        make.write(tmp_path / name, again)
        assert (tmp_path / name).read_bytes() == (shipped.folder("sample") / name).read_bytes()


@pytest.mark.parametrize("name", DIGESTS)
def test_the_recordings_are_the_ones_that_were_heard(name: str) -> None:
    with wave.open(str(shipped.folder("sample") / name)) as file:
        assert hashlib.sha256(file.readframes(file.getnframes())).hexdigest() == DIGESTS[name]


@pytest.mark.parametrize(
    ("name", "channels", "seconds"), [("plucked", 2, 7.5), ("chord", 1, 9.0), ("drums", 1, 8.0), ("speech", 1, 8.0)]
)
def test_kind_length_and_size(name: str, channels: int, seconds: float) -> None:
    info = probe(shipped.resolve(name, "sample"))
    assert (info.rate, info.channels, info.seconds, info.subtype) == (RATE, channels, seconds, "PCM_16")
    assert info.path.stat().st_size < 1_500_000


def test_plucked_has_its_rumble_below_30_hz_and_its_music_above_60() -> None:
    samples = codes("plucked.wav") / 2**15
    assert dbfs(np.max(np.abs(samples))) == pytest.approx(-12, abs=0.01)  # a code is 1e-3 dB there
    assert not samples[-RATE // 20 :].any()
    spectrum = np.abs(np.fft.rfft(samples * np.hanning(len(samples))[:, np.newaxis], axis=0)) ** 2
    hertz = np.fft.rfftfreq(len(samples), 1 / RATE)
    rumble, gap, music = (
        spectrum[(hertz >= low) & (hertz < high)].sum() for low, high in ((2, 30), (35, 60), (60, 20000))
    )
    # Loud enough that a high-pass filter is wanted, and clear of the music by more than a filter's skirt.
    assert -10 < 10 * np.log10(rumble / music) < 10
    assert 10 * np.log10(gap / rumble) < -20


def test_chord_is_quiet_and_ends_in_silence() -> None:
    samples = codes("chord.wav")[:, 0] / 2**15
    assert dbfs(np.max(np.abs(samples))) == pytest.approx(-30, abs=0.01)  # a code is 0.008 dB there
    assert samples[: 5 * RATE].any()
    assert not samples[6 * RATE :].any()  # three seconds of zeros
    peaks = [np.max(np.abs(samples[second * RATE : (second + 1) * RATE])) for second in range(2, 7)]
    assert peaks == sorted(peaks, reverse=True)
    assert samples[0] == 0


def test_drums_are_loud_in_the_bass_and_end_in_silence() -> None:
    samples = codes("drums.wav")[:, 0] / 2**15
    assert dbfs(np.max(np.abs(samples))) == pytest.approx(-0.3, abs=0.01)
    assert not samples[-RATE // 4 :].any()
    spectrum = np.abs(np.fft.rfft(samples)) ** 2
    hertz = np.fft.rfftfreq(len(samples), 1 / RATE)
    bass, skins, metal = (
        spectrum[(hertz >= low) & (hertz < high)].sum() for low, high in ((35, 120), (120, 1000), (5000, 20000))
    )
    assert bass > 10 * skins  # what a bass shelf raises is most of it
    assert metal > bass / 1000  # and there is treble to take off


PAUSES = [(0.0, 0.1), (2.4, 2.9), (4.8, 5.2), (7.3, 8.0)]  # seconds


def test_speech_has_hum_under_its_phrases_and_silence_between_them() -> None:
    samples = codes("speech.wav")[:, 0] / 2**15
    assert dbfs(np.max(np.abs(samples))) == pytest.approx(-12, abs=0.01)
    for start, stop in PAUSES:
        assert not samples[int(start * RATE) : int(stop * RATE)].any()
    for (_, start), (stop, _) in itertools.pairwise(PAUSES):
        phrase = samples[int((start + 0.1) * RATE) : int((stop - 0.1) * RATE)]
        tone = np.exp(-2j * np.pi * 50 / RATE * np.arange(len(phrase))) * np.hanning(len(phrase)) * 4 / len(phrase)
        # The script makes hum of 0.05 / 1.05 of the peak or a little more, as the loudest voice has less than 1: -38 dBFS.
        assert dbfs(abs(phrase @ tone)) == pytest.approx(-38, abs=1)


def test_speech_has_formants_that_move() -> None:
    """Of the syllable from "a" to "i": the strongest partial above 500 Hz begins near the first formant and ends near the
    second or third."""
    samples = codes("speech.wav")[:, 0] / 2**15
    strongest = []
    for start in (0.33, 0.46):  # seconds
        piece = samples[int(start * RATE) : int(start * RATE) + RATE // 20] * np.hanning(RATE // 20)
        spectrum = np.abs(np.fft.rfft(piece))
        hertz = np.fft.rfftfreq(len(piece), 1 / RATE)
        above = hertz > 1200
        strongest.append(hertz[above][spectrum[above].argmax()])
    assert strongest[0] < 1500 < 1900 < strongest[1] < 2500


# Finding


def test_a_shipped_recording_is_found_with_or_without_its_extension() -> None:
    chord = shipped.folder("sample") / "chord.wav"
    assert shipped.resolve("chord", "sample") == chord
    assert shipped.resolve("chord.wav", "sample") == chord
    assert shipped.names("sample") == ["chord", "drums", "plucked", "speech"]


def test_a_file_as_given_comes_first_and_a_folder_does_not(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    (tmp_path / "chord").mkdir()
    assert shipped.resolve("chord", "sample") == shipped.folder("sample") / "chord.wav"
    (tmp_path / "chord.wav").touch()
    assert shipped.resolve("chord.wav", "sample") == Path("chord.wav")
    (tmp_path / "other").mkdir()
    assert shipped.resolve("other", "sample") == Path("other")  # whose reader says that it is a folder


def test_an_unknown_name_is_refused_with_the_nearest() -> None:
    with pytest.raises(AudioFileError, match=r'^plukced\.wav: there is no such file.*Did you mean "plucked"\?$'):
        shipped.resolve("plukced.wav", "sample")
    with pytest.raises(AudioFileError, match=r"no shipped recording of this name\. Shipped are: chord, drums, plucked, speech"):
        shipped.resolve("xyz", "sample")
    with pytest.raises(AudioFileError, match="no such file"):
        shipped.resolve("make.py", "sample")


def test_presets_are_found_in_sub_folders_unless_several_have_the_name(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(shipped, "folder", lambda kind: tmp_path)
    for name in ("rumble.toml", "speaker/tone.toml", "desk/tone.toml", "desk/note.txt"):
        (tmp_path / name).parent.mkdir(exist_ok=True)
        (tmp_path / name).touch()
    assert shipped.names("preset") == ["desk/tone", "rumble", "speaker/tone"]
    assert shipped.resolve("rumble", "preset") == tmp_path / "rumble.toml"
    assert shipped.resolve("speaker/tone", "preset") == tmp_path / "speaker" / "tone.toml"
    assert shipped.resolve("desk/tone.toml", "preset") == tmp_path / "desk" / "tone.toml"
    with pytest.raises(PresetError, match=r"several shipped files have this name: desk/tone\.toml, speaker/tone\.toml"):
        shipped.resolve("tone", "preset")
    with pytest.raises(PresetError, match='Did you mean "rumble"') as caught:
        shipped.resolve("rumbel.toml", "preset")
    assert len(caught.value.problems) == 1


def test_an_installed_package_has_its_own_folders(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    package = tmp_path / "site" / "streamhost"
    package.mkdir(parents=True)
    monkeypatch.setattr(shipped, "__file__", str(package / "shipped.py"))
    assert shipped.folder("preset") == tmp_path / "site" / "presets"
    assert shipped.folder("sample") == tmp_path / "site" / "audio_samples"
    (package / "presets_shipped").mkdir()
    (package / "audio_samples").mkdir()
    assert shipped.folder("preset") == package / "presets_shipped"
    assert shipped.folder("sample") == package / "audio_samples"
