"""`streamhost draw`: the block diagram of a preset, as text for a terminal or as an SVG file."""

from collections.abc import Sequence
from dataclasses import replace
from pathlib import PurePath
from typing import TYPE_CHECKING

import click

from streamhost.commands.common import force_option, presets_named, structures_option, vary_one_option
from streamhost.errors import RequestError

if TYPE_CHECKING:
    from streamhost.diagram import Diagram
    from streamhost.realization import Realization

SVG = ".svg"


@click.command()
@click.argument("preset")
@click.option("-o", "--output", "output", metavar="FILE.svg", default=None, help="Write the drawing as SVG instead.")
@click.option("--rounded", is_flag=True, help="Mark with Q where the program rounds.")
@click.option("--values", type=click.Choice(["table", "beside", "none"]), default="table", show_default=True,
              help="Where the values of the coefficients stand; those beside the gains, in SVG only, need room there.")
@click.option("--equation", "by_node", is_flag=True, help="Print one equation for each node, not one for each output.")
@vary_one_option
@structures_option
@force_option
def draw(
    preset: str, output: str | None, rounded: bool, values: str, by_node: bool, variations: Sequence[str], force: bool
) -> None:
    """The block diagram of PRESET and its difference equation, of the coefficients before they are rounded.

    As plain text, or with -o the diagram as SVG, which holds the equation where it fits on a line.
    """
    from streamhost.presets.realizing import realize_preset

    check_output(output)
    presets = presets_named([preset], variations)
    if len(presets) > 1:
        raise RequestError(f"--vary makes {len(presets)} realizations of {preset}, and one is drawn. Give each key one value.")
    realization = realize_preset(presets[0])
    marks = rounded_nodes(realization) if rounded else frozenset()
    diagram = drawn_diagram(realization)
    if output is None:
        from streamhost.drawing import plain

        click.echo(plain(diagram, rounded=marks, values=values))
        click.echo()
        click.echo(equations(diagram, by_node))
        return
    from streamhost.drawing import svg
    from streamhost.files import write_text_atomic

    write_text_atomic(output, svg(diagram, rounded=marks, values=values), overwrite=force)
    if by_node:
        click.echo(equations(diagram, by_node))


def check_output(output: str | None) -> None:
    """RequestError unless the file is one that can be written."""
    if output is not None and PurePath(output).suffix.lower() != SVG:
        raise RequestError(f'The drawing is written as SVG, and "{output}" does not end in {SVG}. Other kinds of picture need '
                           f"a program that converts them; browsers and word processors take SVG as it is.")


def equations(diagram: "Diagram", by_node: bool) -> str:
    """One equation for each output or node; channels each have their own where their coefficients differ."""
    from streamhost.diagram.equation import equation, node_equations

    alike = bool((diagram.values == diagram.values[:, :1]).all())
    blocks = []
    for channel in range(1 if alike else diagram.channels):
        text = node_equations(diagram, None, channel) if by_node else \
            equation(diagram, None, channel, marked=len(diagram.outputs) > 1)
        blocks.append(text if alike else f"# channel {channel + 1}\n{text}")
    return "\n\n".join(blocks)


def drawn_diagram(realization: "Realization") -> "Diagram":
    """The diagram as drawn: with the signs turned where the format stores negated feedback."""
    from streamhost.formats import Fixed
    from streamhost.program.lowering import negate_feedback

    diagram = realization.diagram
    if not isinstance(realization.format, Fixed) or realization.format.feedback != "negated":
        return diagram
    turned = negate_feedback(diagram)
    return replace(turned, hints=replace(diagram.hints, nodes=turned.nodes))


def rounded_nodes(realization: "Realization") -> frozenset[int]:
    """The nodes of the drawn diagram whose value the program rounds."""
    from streamhost.diagram import Round

    program = realization.program
    place = {node.label: index for index, node in enumerate(realization.diagram.nodes) if node.kind != "output"}
    found: set[int] = set()
    for node in program.nodes:
        if not isinstance(node, Round):
            continue
        source = program.nodes[node.source]
        while isinstance(source, Round) and source.label not in place:
            source = program.nodes[source.source]
        if source.label in place:
            found.add(place[source.label])
    return frozenset(found)
