"""`streamhost forms`."""

import pytest

from streamhost.commands.main import main
from streamhost.filters import kinds
from streamhost.formats import ARITHMETICS, FLOATS, OVERFLOWS, ROUNDINGS
from streamhost.structures import ORDERINGS, PAIRINGS, SCALINGS, decompositions, form, forms


def test_everything_that_can_be_chosen_is_listed(capsys):
    assert main(["forms"]) == 0
    lines = capsys.readouterr().out.splitlines()
    for name in forms():
        assert any(line.split() == [name, *form(name).summary.split()] for line in lines)
    rows = {line.split()[0]: line.split(maxsplit=1)[1] for line in lines if "." in line.split(" ")[0] and " " in line}
    assert rows["structure.decomposition"].split(", ") == list(decompositions())
    assert rows["structure.pairing"].split(", ") == list(PAIRINGS)
    assert rows["structure.ordering"].split(", ") == list(ORDERINGS)
    assert rows["structure.scaling"].split(", ") == list(SCALINGS)
    assert rows["format.arithmetic"].split(", ") == [*ARITHMETICS, *FLOATS]
    assert rows["format.rounding"].split(", ") == list(ROUNDINGS)
    assert rows["format.overflow"].split(", ") == list(OVERFLOWS)
    assert rows["filter.kind"].split(", ") == list(kinds())


@pytest.mark.parametrize("name", forms())
def test_a_form_is_explained(name, capsys):
    assert main(["forms", name]) == 0
    shown = capsys.readouterr().out
    assert shown.strip() == form(name).docs.strip()
    assert "Source:" in shown


def test_an_unknown_form_is_refused_with_the_nearest(capsys):
    assert main(["forms", "dirct-2"]) == 2
    assert 'Did you mean "direct-2"?' in capsys.readouterr().err
