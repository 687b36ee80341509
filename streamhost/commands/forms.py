"""`streamhost forms`: what can be chosen for a structure and a format; one form explained."""

import click

from streamhost.commands.common import GAP


@click.command()
@click.argument("name", required=False)
def forms(name: str | None) -> None:
    """What can be chosen; with the NAME of a form, how it is drawn, what it costs, and what it is good and bad at."""
    from streamhost.structures import form

    click.echo(form(name).docs.strip() if name is not None else "\n\n".join(_everything()))


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
