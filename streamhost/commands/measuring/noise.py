"""What the instrument `noise` says."""

from collections.abc import Iterator

from streamhost.commands.common import MINUS, Column, ledger
from streamhost.measure import OutputNoise, RoundingNoise, SignalNoise

COLUMNS = (
    Column("signal"), Column("output"), Column("measured", "dBFS", 1), Column("95 %", "± dB", 2),
    Column("predicted", "dBFS", 1), Column("white", "model"), Column("A-weighted", "dBFS", 1), Column("468", "rms", 1),
    Column("468", "quasi-peak", 1), Column("full band", "dBFS", 1), Column("mean", "LSB", 2),
)
SOURCES = (Column("rounding"), Column("predicted", "dBFS", 1), Column("share", "%", 1))
MOST_SOURCES = 12
WHITE = {True: "holds", False: "fails", None: None}


def lines(result: RoundingNoise) -> Iterator[str]:
    """A ledger of signals and outputs, why figures are missing, the roundings, and what all that is worth."""
    predicted = {one.output: one.predicted_dbfs for one in result.each}
    yield ledger(COLUMNS, [[
        one.signal, one.output or "y", one.measured_dbfs, one.measured_interval_db, predicted[one.output],
        WHITE[one.white_model_holds], one.measured_a_dbfs, one.measured_468_rms_dbfs, one.measured_468_quasi_peak_dbfs,
        one.measured_full_dbfs, one.mean_lsb,
    ] for one in result.runs], numbered=False)
    for one in result.each:
        if one.channel is not None:
            yield _of(one.output, f"this is of channel {one.channel}, the worst.")
    for run in result.runs:
        yield from (f"{run.signal}: {_of(run.output, said, begins=False)}" for said in _remarks(run))
    for one in result.each:
        yield from _sources(one)
    yield from _ranges(result)
    if result.estimate:
        yield "In floating point the predicted noise is an estimate."
    yield f"The ideal ran in {result.ideal}."


def _of(output: str, said: str, *, begins: bool = True) -> str:
    if output:
        return f"{output}: {said}"
    return said[:1].upper() + said[1:] if begins else said


def _remarks(one: SignalNoise) -> Iterator[str]:
    if one.reason:
        yield f"no noise figure: {one.reason}."
        return
    if one.excluded_percent:
        yield f"{one.excluded_percent:.2f} % of the frames do not count: an overflow was near."
    if one.white_model_holds is False:
        yield f"the white model does not hold here: {one.white_model_reason}."


def _sources(one: OutputNoise) -> Iterator[str]:
    """Where several roundings make the noise."""
    if len(one.sources) < 2:
        return
    yield _of(one.output, "by rounding:")
    shown = one.sources[:MOST_SOURCES]
    yield ledger(SOURCES, [[each.rounding, each.predicted_dbfs, each.share_percent] for each in shown], numbered=False)
    if left := one.sources[MOST_SOURCES:]:
        yield f"{len(left)} more roundings together: {sum(each.share_percent for each in left):.1f} %."


def _ranges(result: RoundingNoise) -> Iterator[str]:
    for one in result.dynamic_ranges:
        tone = f"with a tone of {MINUS}60 dBFS at {one.tone_hz:.4g} Hz"
        if one.dynamic_range_db is None:
            yield _of(one.output, f"no dynamic range {tone}: {one.reason}.")
        else:
            yield _of(one.output, f"dynamic range {tone}: {one.dynamic_range_db:.1f} dB through the 468 curve as rms, 0 dB at "
                                  f"2 kHz (AES17), {one.dynamic_range_a_db:.1f} dB A-weighted.")
