"""What the instrument `noise` says."""

from collections.abc import Iterator

from streamhost.commands.common import Column, ledger
from streamhost.measure import OutputNoise, RoundingNoise

COLUMNS = (
    Column("output"), Column("measured", "dBFS", 1), Column("95 %", "± dB", 2), Column("predicted", "dBFS", 1),
    Column("white", "model"), Column("A-weighted", "dBFS", 1), Column("full band", "dBFS", 1), Column("mean", "LSB", 2),
)
WHITE = {True: "holds", False: "fails", None: None}


def lines(result: RoundingNoise) -> Iterator[str]:
    """A ledger of outputs, why figures are missing, and what they are worth."""
    yield ledger(COLUMNS, [[
        one.output or "y", one.measured_dbfs, one.measured_interval_db, one.predicted_dbfs, WHITE[one.white_model_holds],
        one.measured_a_dbfs, one.measured_full_dbfs, one.mean_lsb,
    ] for one in result.each], numbered=False)
    for one in result.each:
        yield from (f"{one.output}: {said}" if one.output else said[:1].upper() + said[1:] for said in _remarks(one))
    if result.estimate:
        yield "In floating point the predicted noise is an estimate."
    yield f"The ideal ran in {result.ideal}."


def _remarks(one: OutputNoise) -> Iterator[str]:
    if one.channel is not None:
        yield f"this is of channel {one.channel}, the worst."
    if one.reason:
        yield f"no noise figure: {one.reason}."
        return
    if one.excluded_percent:
        yield f"{one.excluded_percent:.2f} % of the frames do not count: an overflow was near."
    if one.white_model_holds is False:
        yield f"the white model does not hold here: {one.white_model_reason}."
