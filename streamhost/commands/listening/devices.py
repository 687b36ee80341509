"""`listen --devices`."""

from streamhost.commands.common import Cell, Column, ledger


def device_ledger() -> str:
    """A row for each sound card, with its number and name as --device takes them."""
    from streamhost.live.listing import found_devices

    found = found_devices()
    if not found:
        return "There is no sound card. --no-device runs without one."
    rows: list[list[Cell]] = [
        [each.number, each.name, each.host, each.inputs, each.outputs, each.rate, "the system's own" if each.preferred else ""]
        for each in found
    ]
    columns = [Column(""), Column("name"), Column("through"), Column("in"), Column("out"), Column("rate", "Hz", 0), Column("")]
    return ledger(columns, rows, numbered=False)
