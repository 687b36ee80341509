"""What the instrument `float` says."""

from collections.abc import Iterator
from math import isfinite

from streamhost.commands.common import MINUS, Column, ledger
from streamhost.measure import FloatParticulars
from streamhost.measure.floats import Drift, Tail

SUMS = (Column("sum"), Column("largest", "dBFS", 1), Column("of the input", "dBFS", 1), Column("loses", "bits", 1),
        Column("of", "bits"))
MOST_SUMS = 5
MUCH_SLOWER = 1.5


def lines(result: FloatParticulars) -> Iterator[str]:
    """The tail, its cost, low-order bits, drift, and what the predicted noise is worth."""
    if not result.applies:
        yield f"Does not apply: {result.reason}."
        return
    wide = f", sums {result.sum_type}" if result.sum_type != result.type else ""
    kept = "flushed to 0 where a delay stores them" if result.flush_subnormals else "kept"
    yield f"{result.type}{wide}. Subnormals, below {_power(result.smallest_normal)}, are {kept}."
    if result.tail is not None:
        yield from _tail(result.tail)
    if result.sums:
        yield ledger(SUMS, [[one.sum, one.largest_dbfs, one.input_dbfs, one.lost_bits, one.mantissa_bits]
                            for one in result.sums[:MOST_SUMS]], numbered=False)
        yield _low_bits(result)
    yield from map(_drift, result.drift)
    if result.drift_reason:
        yield f"Drift: none, {result.drift_reason}."
    yield "Noise: what the instrument noise predicts is an estimate here, for it grows and shrinks with the signal."


def _tail(tail: Tail) -> Iterator[str]:
    after = f"After {tail.signal_s:g} s of noise, peak {_number(tail.signal_peak_dbfs, 0)} dBFS,"
    if tail.first_frame is None:
        if tail.ended_frame is not None:
            yield f"{after} no state becomes subnormal: all are 0 after {tail.ended_frame} frames."
        else:
            yield f"{after} no state becomes subnormal, and they do not die out: {tail.watched_frames} frames were watched."
        return
    longest = max(tail.states, key=lambda state: state.subnormal_frames)
    began = f"{after} states are subnormal from frame {tail.first_frame} on"
    if tail.for_ever:
        period = "they stand still" if tail.period_frames == 1 else f"they repeat every {tail.period_frames} frames"
        yield (f"{began} and for ever, first of all {longest.state}: {period} and never reach 0. flush_subnormals = true ends "
               "it.")
    elif tail.ended_frame is not None:
        yield f"{began}, for {tail.subnormal_frames} frames, longest {longest.state}; all are 0 after {tail.ended_frame}."
    else:
        yield f"{began}, longest {longest.state}, and still after {tail.watched_frames} frames."
    if tail.tail_ns_per_frame is not None and tail.normal_ns_per_frame is not None:
        slower = tail.tail_ns_per_frame / tail.normal_ns_per_frame
        judged = f"{slower:.1f} times as much" if slower >= MUCH_SLOWER else "not noticeably more"
        yield (f"There a frame costs {tail.tail_ns_per_frame:.1f} ns, in the noise {tail.normal_ns_per_frame:.1f}: {judged} (a "
               "timing on this machine; the target's core may take far longer over a subnormal).")


def _low_bits(result: FloatParticulars) -> str:
    worst = result.sums[0]
    if worst.lost_bits < 1.0:
        return "No sum drops low-order bits of its input: nothing in it is twice as large."
    left = worst.mantissa_bits - worst.lost_bits
    return f"The sum {worst.sum} drops {worst.lost_bits:.1f} low-order bits of its input: {left:.1f} are left."


def _drift(one: Drift) -> str:
    of = f"{one.output}: d" if one.output else "D"
    if not isfinite(one.found_after_1_s_dbfs):
        return f"{of}rift: none was found in {one.duration_s:g} s."
    return (f"{of}rift of its running sum: {_number(one.found_after_1_s_dbfs)} dBFS in 1 s, predicted "
            f"{_number(one.predicted_after_1_s_dbfs)}; it grows as the root of the time, and after {one.duration_s:g} s was "
            f"{_number(one.at_end_dbfs)} dBFS.")


def _power(value: float | None) -> str:
    return f"{value:.2g}".replace("-", MINUS)


def _number(value: float, decimals: int = 1) -> str:
    return f"{value:.{decimals}f}".replace("-", MINUS)
