"""What is particular to floating point: subnormal tails, drifting sums, lost low-order bits."""

from collections.abc import Callable
from dataclasses import replace

import numpy as np

from streamhost.formats import Float
from streamhost.measure.floats.drifting import NO_SUM, drifts
from streamhost.measure.floats.low_bits import MANTISSA_BITS, lost_bits
from streamhost.measure.floats.playing import SIGNAL_S, Player, noise
from streamhost.measure.floats.result import FloatParticulars
from streamhost.measure.floats.tails import tail_of
from streamhost.program.float_errors import UNITS
from streamhost.program.poles import running_sums
from streamhost.realization import Realization

Report = Callable[[float, str], None]

TAIL_SHARE = 0.5


def float_particulars(
    realization: Realization, *, quick: bool = False, report: Report = lambda share, doing: None,
) -> FloatParticulars:
    """What is particular to floating point. Of fixed point, that it does not apply.

    quick: a tail of 10 s at most, a walk of 3 s. report: is told the share of the work that is done, and what is being done.
    """
    format = realization.format
    if not isinstance(format, Float):
        return FloatParticulars(applies=False, reason=f"{format.label} is fixed point: its numbers have one step throughout")
    info = np.finfo(format.type)
    found = FloatParticulars(
        applies=True, reason="", type=format.type, sum_type=format.sum_type, unit_roundoff=UNITS[format.type],
        smallest_normal=float(info.tiny), smallest_subnormal=float(info.smallest_subnormal),
        largest_exact_integer=2 ** MANTISSA_BITS[format.type], flush_subnormals=format.flush_subnormals,
        drift_reason="" if running_sums(realization.program)[1] else NO_SUM, noise_is_estimate=True, complete=False,
    )
    try:
        player = Player(realization)
        x = noise(round(SIGNAL_S * realization.rate))
        peaks = np.zeros(len(player.program.nodes))
        for trace in player.blocks(x):
            peaks = np.maximum(peaks, np.abs(trace).max(axis=(0, 1)))
        sums = lost_bits(player.program, peaks)
        found = replace(found, sums=sums, lost_bits=sums[0].lost_bits if sums else None)
        tail = tail_of(player, x, quick, lambda share, doing: report(TAIL_SHARE * share, doing))
        found = replace(found, tail=tail)
        walks = tuple(drifts(realization, quick, lambda share, doing: report(TAIL_SHARE + (1 - TAIL_SHARE) * share, doing)))
        return replace(found, drift=walks, complete=True)
    except KeyboardInterrupt:
        return found
