"""`streamhost import`: coefficients from a foreign file, as a preset."""

from pathlib import Path

import click

from streamhost.commands.common import force_option, printable
from streamhost.errors import RequestError
from streamhost.presets.importing import FEEDBACKS


@click.command("import")
@click.argument("file")
@click.option("--rate", type=float, required=True, metavar="HZ", help="The sample rate that the coefficients are for.")
@click.option("-o", "--output", "destination", metavar="PRESET", help="Write this file; unless said, to standard output.")
@click.option(
    "--columns", metavar="NAMES",
    help="What stands in a row: b0,b1,b2,a0,a1,a2 in the order of the file, without a0 where it is left out, - for a column "
    "that is not read; or b for one list of a finite response.",
)
@click.option(
    "--feedback", type=click.Choice(FEEDBACKS),
    help="Whether a1, a2 are subtracted in the difference equation (the transfer function's sign) or added. Unless said: the "
    "one that is stable, and refused if both are.",
)
@click.option("--word", metavar="WORD", help="The word of integer codes, for instance Q2.14.")
@force_option
def import_(
    file: str, rate: float, destination: str | None, columns: str | None, feedback: str | None, word: str | None, force: bool
) -> None:
    """The coefficients in FILE as a preset.

    FILE is text with a row of five or six numbers for each section, or with lines of b and of a; JSON; a NumPy archive
    (sos; b and a; z, p and k); or C source with arrays. What it holds decides, not its name. All that was decided is
    printed and stands in the preset.
    """
    from streamhost.files import same_file, write_text_atomic
    from streamhost.presets.importing import import_filter
    from streamhost.presets.writing import preset_text

    if destination is not None and same_file(file, destination):
        raise RequestError(f"{destination}: this is the file that is imported. Write the preset to another.")
    imported = import_filter(file, rate=rate, columns=columns, feedback=feedback, word=word)
    text = preset_text(imported.filter, comments=(f"Imported from {Path(file).name}.", *imported.notes))
    if destination is None:
        click.echo(text, nl=False)
    else:
        write_text_atomic(destination, text, overwrite=force)
    order = f"{destination or 'preset'}: a filter of order {imported.filter.order} at {imported.filter.rate:g} Hz"
    click.echo("\n".join(map(printable, [order, *imported.notes])), err=destination is None)
