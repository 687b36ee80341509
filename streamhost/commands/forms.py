"""`streamhost forms`: what can be chosen for a structure and a format; one form explained."""

import click

from streamhost.commands.common import GAP, structures_option


@click.command()
@click.argument("name", required=False)
@structures_option
def forms(name: str | None) -> None:
    """What can be chosen; with the NAME of a form, how it is drawn, what it costs, and what it is good and bad at."""
    click.echo(_explained(name) if name is not None else "\n\n".join(_everything()))


def _explained(name: str) -> str:
    """What a form says of itself; a drawing of a second-order section where it says nothing."""
    from streamhost.drawing import plain
    from streamhost.filters import Filter
    from streamhost.structures import build, form

    found = form(name)
    if found.docs.strip():
        return found.docs.strip()
    section = Filter.from_sections([[0.5, 0.25, 0.125, 1.0, -0.5, 0.25]], rate=48000)
    return f"{name}: {found.summary}\n\n{plain(build(section, form=name, decomposition='whole').diagram)}"


def _everything() -> list[str]:
    """Paragraphs, each headed by the key of a preset that takes one of the names."""
    from streamhost import structures
    from streamhost.filters import kinds
    from streamhost.formats import ARITHMETICS, FLOATS, OVERFLOWS, ROUNDINGS

    summaries = {name: structures.form(name).summary for name in structures.forms()}
    width = max(map(len, summaries))
    lines = [f"{GAP}{name:{width}}{GAP}{summary}" for name, summary in summaries.items()]
    choices = {
        "structure.decomposition": structures.decompositions(),
        "structure.pairing": structures.PAIRINGS,
        "structure.ordering": structures.ORDERINGS,
        "structure.scaling": structures.SCALINGS,
        "structure.outputs": structures.OUTPUTS,
        "format.arithmetic": (*ARITHMETICS, *FLOATS),
        "format.rounding": ROUNDINGS,
        "format.overflow": OVERFLOWS,
        "filter.kind": kinds(),
    }
    widest = max(map(len, choices))
    return [
        "\n".join(["structure.form", *lines]),
        "\n".join(f"{key:{widest}}{GAP}{', '.join(values)}" for key, values in choices.items()),
        "`streamhost forms NAME` explains a form. Every key can be varied: --vary structure.form=direct-1,transposed-2",
    ]
