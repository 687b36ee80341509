"""Files and texts that are no presets at all."""

from pathlib import Path

import pytest
from test_presets import GOOD, problem

from streamhost.errors import MachineError, PresetError
from streamhost.presets import load_preset
from streamhost.presets.reading import LARGEST_BYTES

SYNTAX = {
    "rate = 48000\nkind = high-pass\n":
        "mine.toml:2: this is no TOML: at column 8, what stands here is no value; texts stand in quotes, "
        "a point stands between two digits.",
    "rate = 1\nrate = 2\n[limits]\n": "mine.toml:2: this is no TOML: at column 9, a key is stated twice.",
    "[format]\n[format]\n": "mine.toml:2: this is no TOML: at column 8, a table is headed twice.",
    "rate 48000\n": "mine.toml:1: this is no TOML: at column 6, a key is followed by = and its value.",
    "rate = 1 2\n":
        "mine.toml:1: this is no TOML: at column 10, something follows where the line should end.",
    'rate = 1\ntitle = "open': "mine.toml:2: this is no TOML: at the end, a text is not closed by its quote.",
    "rate = 1\nb = [1, \n\n": "mine.toml:2: this is no TOML: at the end, what stands here is no value; "
                              "texts stand in quotes, a point stands between two digits.",
    "rate = " + "9" * 5000: "mine.toml: a number in it has more digits than can be read.",
    "\n\nb = " + "[" * 5000:
        "mine.toml:3: a preset has no place for lists or tables inside each other more than 16 deep.",
    "a" + ".a" * 100_000 + " = 1\n": "mine.toml:1: a preset has no place for a key of more than 16 parts.",
    "": "mine.toml: the preset is empty: it states at least rate and one [[filter]].",
    " \n\t\n": "mine.toml: the preset is empty: it states at least rate and one [[filter]].",
}


@pytest.mark.parametrize(("text", "expected"), SYNTAX.items(), ids=range(len(SYNTAX)))
def test_texts_that_are_no_toml(text, expected):
    assert problem(text) == expected


def refusal(path):
    with pytest.raises(PresetError) as caught:
        load_preset(path)
    assert len(caught.value.problems) == 1
    return str(caught.value)


def test_a_missing_file_names_the_nearest_one_beside_it(tmp_path):
    (tmp_path / "rumble-two.toml").write_text(GOOD)
    missing = tmp_path / "rumble-tow.toml"
    assert refusal(missing) == f'{missing}: there is no such file. Did you mean "rumble-two.toml"?'


def test_a_missing_file_names_the_nearest_shipped_preset(tmp_path):
    missing = tmp_path / "rumble-flaot32.toml"
    assert refusal(missing) == f'{missing}: there is no such file. Did you mean "rumble-float32"?'


def test_a_missing_file_like_no_other_is_told_what_ships(tmp_path):
    assert "Shipped are " in refusal(tmp_path / "xyz")


def test_a_folder(tmp_path):
    (tmp_path / "b.toml").touch()
    (tmp_path / "a.toml").touch()
    assert refusal(tmp_path) == (
        f"{tmp_path}: this is a folder, and a preset is a file. Presets in it: a.toml, b.toml."
    )


def test_a_file_inside_a_file(tmp_path):
    (tmp_path / "file").touch()
    inside = tmp_path / "file" / "mine.toml"
    assert refusal(inside) == f"{inside}: this lies inside a file, and a preset is a file."


def test_text_in_another_encoding(tmp_path):
    file = tmp_path / "mine.toml"
    file.write_bytes(b'rate = 48000\ntitle = "Hochpa\xdf"\n')
    assert refusal(file) == f"{file}:2: the file is no text in UTF-8: the byte 0xDF is none."


def test_a_file_of_the_largest_size_is_read_and_one_byte_more_is_not(tmp_path):
    file = tmp_path / "mine.toml"
    largest = GOOD.encode() + b"#" * (LARGEST_BYTES - len(GOOD))
    file.write_bytes(largest)
    assert load_preset(file).rate == 48000
    file.write_bytes(largest + b"#")
    assert refusal(file) == f"{file}: the file is larger than 1 MB, which no preset is."


def test_an_endless_file_ends():
    if not Path("/dev/zero").exists():
        pytest.skip("this machine has no endless file")
    assert refusal("/dev/zero") == "/dev/zero: the file is larger than 1 MB, which no preset is."


def test_a_name_that_no_file_can_have():
    assert refusal("mine\0.toml") == "'mine\\x00.toml': no file has such a name."


def test_a_file_that_the_machine_does_not_give_is_the_machines_failure(tmp_path):
    with pytest.raises(MachineError, match=r"the preset cannot be read: File name too long\.") as caught:
        load_preset(tmp_path / ("x" * 300))
    assert caught.value.exit_status == 3
