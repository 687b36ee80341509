"""One filter in all forms that carry it."""

import json

import pytest

from streamhost import forms, load_preset
from streamhost.commands.compare_text import refused
from streamhost.commands.main import main
from streamhost.presets import vary
from streamhost.presets.realizing import realize_those_that_carry
from streamhost.shipped import folder

FINITE = {"folded", "fir-lattice", "running-sum", "frequency-sampling"}


def test_forms_that_are_sought_may_be_refused():
    preset = load_preset(folder("preset") / "rumble-double-state.toml")
    family = vary([preset], ["structure.form=all"])
    assert [one.form for one in family] == list(forms())
    made, refusals = realize_those_that_carry(family, 1)
    assert [one.form for one, _ in made] == [realization.form for _, realization in made]
    reasons = {each.preset.form: each.reason for each in refusals}
    assert {one.form for one, _ in made} | reasons.keys() == set(forms())
    assert reasons.keys() == {"all-pass-sum", "wave-digital", "lattice-one-multiplier", *FINITE}
    assert "does not fit Q2.30" in reasons["lattice-one-multiplier"]  # its v2 is 31.9
    [head, *sentences] = refused(refusals)
    assert head.startswith("Not compared")
    assert "folded, fir-lattice, running-sum, frequency-sampling: it has a recursion" in " ".join(sentences)


@pytest.mark.slow
def test_one_filter_in_all_forms_that_carry_it_and_in_one_of_the_users_own(tmp_path, capsys):
    own, asked = tmp_path / "offset.py", tmp_path / "rumble.toml"
    tutorial = (folder("preset").parent / "README.md").read_text("utf-8").split("say `offset.py`:\n\n```python\n")[1]
    own.write_text(tutorial.split("```")[0], "utf-8")
    shipped = (folder("preset") / "rumble-double-state.toml").read_text("utf-8")
    asked.write_text(shipped.replace('"Q2.30"', '"Q6.26"').partition("[limits]")[0], "utf-8")
    assert main(["compare", str(asked), "--input", "plucked", "--structures", str(own), "--vary", "structure.form=all",
                 "--json", "-"]) == 0
    found = json.loads(capsys.readouterr().out)
    rows = {row["form"]: row for row in found["realizations"]}
    assert "offset" in rows
    assert {each["form"] for each in found["refused"]} == {"all-pass-sum", "wave-digital", *FINITE}
    heard = {form: row for form, row in rows.items() if row["noise_dbfs"] is not None}
    assert len(heard) >= 11  # the direct form, state-variable, error-feedback and low-frequency ones, and the own
    for form, row in heard.items():  # 20 dB and more above what their states add, the output's own rounding is heard
        assert row["noise_dbfs"] == pytest.approx(row["noise_predicted_dbfs"], abs=1.0), form
