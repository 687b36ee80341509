"""What the instrument `overflow` gives. Norms and bounds are magnitudes, 1.0 = full scale of the input."""

from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

CURVE: Any = {"curve": True}


@dataclass(frozen=True)
class Register:
    """One place where a value meets a word. kind: "register", "accumulator" or "operand" (inside a tapped line).

    l1, l2, peak: norms of the response from the input, infinite where it does not die out: no input makes the value larger
    than l1, no sine larger than peak, white noise of power 1 gives it the power l2^2 (L. Jackson, 1970). Of an accumulator
    that saturates on the way, l1 is the sum over its terms. bound: the largest value with all roundings before it, never
    too small. largest: what the word holds. headroom: largest over l1; sine_headroom: over peak. fits: bound does. proven: so
    do those of all registers before it, so that no input overflows it. overflows: on the given signal, in all channels, and
    the first frame; None inside a tapped line, where places are not told apart.

    Curves: worst_input (frames,), which brings the value to worst_reaches in its last frame; None where the response does not
    die out.
    """

    name: str
    kind: str
    word: str
    on_overflow: str
    l1: float
    l2: float
    peak: float
    bound: float
    largest: float
    headroom_bits: float
    headroom_db: float
    sine_headroom_db: float
    fits: bool
    proven: bool
    overflows: int | None
    first_frame: int | None
    worst_reaches: float | None
    worst_input: NDArray[np.float64] | None = field(metadata=CURVE, compare=False, repr=False)


@dataclass(frozen=True)
class Recovery:
    """What came after a burst that overflowed registers, in the worst of some trials. after: "silence" or "signal".

    trials: bursts of that kind that overflowed something; oscillating: after how many an oscillation was found. overflows:
    in all of them. recovery_frames: from the end of the burst until the difference from the ideal stays within what roundings
    alone can make (allowed_dbfs); None where it had not by the end of the run. oscillates: it had not, and had ceased to
    shrink. period_frames: of the output, where it repeats itself in silence. peak_dbfs: of the difference in the last quarter.

    Curve: difference (frames, outputs) of that trial, from the start of the burst.
    """

    burst: str
    after: str
    trials: int
    oscillating: int
    overflows: int
    allowed_dbfs: float
    recovery_frames: int | None
    recovery_s: float | None
    oscillates: bool
    period_frames: int | None
    peak_dbfs: float
    burst_frames: int
    difference: NDArray[np.float64] = field(metadata=CURVE, compare=False, repr=False)


@dataclass(frozen=True)
class Overflow:
    """proven: no input within full scale can overflow any register. headroom: the least of all, and where.

    overflows: of registers on the given signal, and the first frame. oscillates: whether an oscillation was found after one of
    the bursts; slowest_recovery: the longest that was found; None where no burst was run, with the `reason`. seed: of the
    random burst. complete: False where the run was broken off.
    """

    proven: bool
    headroom_db: float
    headroom_register: str
    overflows: int
    first_frame: int | None
    oscillates: bool | None
    slowest_recovery_frames: int | None
    slowest_recovery_s: float | None
    registers: tuple[Register, ...]
    recoveries: tuple[Recovery, ...]
    reason: str
    seed: int
    complete: bool
