"""The outputs that a form has inside, asked for beside the filter's own."""

import json

import numpy as np
import pytest
from drawing_reader import faults_of
from scipy import signal

from streamhost import design, realize
from streamhost.commands.main import main
from streamhost.drawing import svg
from streamhost.errors import PresetError, StructureError
from streamhost.presets.reading import parse_preset
from streamhost.presets.realizing import realize_preset

RATE = 48000
PRESET = """
rate = 48000
[[filter]]
kind = "low-pass"
frequency = 1000.0
q = 0.707
[structure]
form = "state-variable"
outputs = "all"
[format]
arithmetic = "float32"
"""


def test_the_state_variable_forms_outputs_are_the_cookbooks() -> None:
    """W3C Audio EQ Cookbook's low-pass, band-pass (gain Q at its peak) and high-pass, by scipy."""
    q = 0.707
    filter = design("low-pass", rate=RATE, frequency=1000, q=q)
    realization = realize(filter, form="state-variable", outputs="all")
    assert realization.outputs == ("y", "low", "band", "high")
    x = np.random.default_rng(1).uniform(-1, 1, 800)
    y = realization.process(x)
    found = {name: y[:, place].ravel() for place, name in enumerate(realization.outputs)}
    for name, kind in (("y", "low-pass"), ("low", "low-pass"), ("high", "high-pass")):
        b, a = design(kind, rate=RATE, frequency=1000, q=q).whole()
        # A hundred operations of values of a few units, through a resonance of less than 10.
        np.testing.assert_allclose(found[name], signal.lfilter(b, a, x), rtol=0, atol=100 * 10 * 2.0**-52)


def test_compare_tells_each_output(tmp_path, capsys) -> None:
    preset, table = tmp_path / "svf.toml", tmp_path / "table.json"
    preset.write_text(PRESET)
    assert main(["compare", str(preset), "--input", "chord", "--json", str(table)]) == 0
    lane = json.loads(table.read_text())["realizations"][0]
    assert [output["name"] for output in lane["outputs"]] == ["y", "low", "band", "high"]
    assert all(output["response_deviation_db"] < 0.01 for output in lane["outputs"])
    assert lane.get("sum_response_deviation_db") is None  # these are not parts of one signal
    assert "svf" in capsys.readouterr().out


def test_it_is_drawn_with_all_its_outputs() -> None:
    diagram = realize(design("low-pass", rate=RATE, frequency=1000, q=1), form="state-variable", outputs="all").diagram
    assert faults_of(svg(diagram), diagram) == []


def test_what_has_none_or_too_many_sections_is_refused() -> None:
    low = design("low-pass", rate=RATE, frequency=1000, q=1)
    with pytest.raises(StructureError, match=r'"all" asks for more than the filter, and form "direct-1" offers none'):
        realize(low, form="direct-1", outputs="all")
    two = design("butterworth", rate=RATE, response="low-pass", order=4, frequency=1000)
    with pytest.raises(StructureError, match="this filter is more than one section"):
        realize(two, form="state-variable", outputs="all")
    with pytest.raises(StructureError, match=r"no outputs 'some'.*Allowed are main, all"):
        realize(low, form="direct-1", outputs="some")


def test_a_preset_says_so_and_is_told_its_line() -> None:
    assert realize_preset(parse_preset(PRESET)).outputs == ("y", "low", "band", "high")
    with pytest.raises(PresetError, match=r"preset:9: outputs = .*is not known: main or all"):
        parse_preset(PRESET.replace('"all"', '"many"'))
    with pytest.raises(PresetError, match=r'preset:9: .*form "direct-1" offers none'):
        realize_preset(parse_preset(PRESET.replace("state-variable", "direct-1")))
