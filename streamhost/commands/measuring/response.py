"""What the instrument `response` says."""

from collections.abc import Iterator

from streamhost.commands.common import Column, ledger
from streamhost.measure import Response

COLUMNS = (
    Column("output"), Column("from", "Hz", 1), Column("to", "Hz", 1), Column("deviates", "dB", 3), Column("at", "Hz", 1),
    Column("leak", "dB", 1),
)


def lines(result: Response) -> Iterator[str]:
    """A ledger of bands, and what is dangerous."""
    yield ledger(COLUMNS, [[one.output or "y", one.low_hz, one.high_hz, one.deviation_db, one.deviation_hz, one.leak_db]
                           for one in result.bands], numbered=False)
    yield from dict.fromkeys(f"No figure: {one.reason}." for one in result.bands if one.reason)
