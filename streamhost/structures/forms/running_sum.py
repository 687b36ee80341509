"""running-sum: the sum of the last L values kept up to date by one addition and one subtraction; N stages, then a gain.

    s1[n] = x[n] - x[n-L] + s1[n-1]
    s2[n] = s1[n] - s1[n-L] + s2[n-1],  ...
    y[n]  = c sN[n]                          c (1 - z^-L)^N / (1 - z^-1)^N = c (1 + z^-1 + ... + z^-(L-1))^N

drawn for one stage:

    x ---+------>(+)------>(+)---+--- s1 ---c---> y
         |      - ^         ^    |
         |        |         |    |
         +--z^-L--+         +-z^-1

Sums are added as they are written. L, N and c are read from the taps.

Source: E. Hogenauer, An economical class of digital filters for decimation and interpolation, IEEE Transactions on
Acoustics, Speech, and Signal Processing 29 (1981), here without a change of rate; Oppenheim & Schafer, moving average.

Counts: one multiplication (none where c is 1), 2N additions, N (L + 1) words of memory; the same moving average in
direct-1 L, L - 1, L - 1. In fixed point one rounding, that of c.

Recursive, with a finite response: the pole at z = 1 of each stage is cancelled by a zero, and must be cancelled exactly.

Good at: long averages, and low-passes for signals that are slow anyway, in fixed point. The sums are registers of
their own, longer than the signal by what the stages before and with them add, ceil(k log2 L) bits for stage k, and they
wrap. Arithmetic modulo 2^bits loses nothing, whatever goes round on the way, since the final sum fits: the output is
that of the taps with integer weights, bit for bit.

Fails: one bit less, and a loud signal comes out wrong. A sum that saturates is wrong for ever after, so that there is
no such mark. In floating point the mark means nothing, each addition is rounded, and what is lost once stays: the
output drifts. Also where what comes in has more fraction bits than the signal (a state longer than the signal, of a
section before).

Arithmetic: fixed point, the state no longer than the signal. c is as small as L^-N: of several stages it keeps few bits
where an accumulator of a stated length (16x16+40, 24x24+56) gives coefficients at least one integer bit, and all of them
behind a full one. Not floating point.

Carries: a finite response c (1 + z^-1 + ... + z^-(L-1))^N, L at least 2 and L^N no more than 2^30, found by comparing
each tap with c times the integer it must be; it may be off by 2^-48 of itself, as roundings leave it. Draw it whole.
"""

from dataclasses import dataclass
from fractions import Fraction
from functools import lru_cache

from streamhost.diagram.builder import Ref, minus
from streamhost.filters.exact import Polynomial
from streamhost.structures.division import Ratio
from streamhost.structures.form import Draft, Form, Size
from streamhost.structures.taps import refused_recursion

TOLERANCE = Fraction(1, 1 << 48)
MOST_STAGES = 64
MOST_GROWTH = 30
"""With so many bits more the sums of a signal of 32 bits stand in a word of 64."""

STAGE = 3.25
A_ROW = 3
"""Stages drawn side by side."""

HEIGHT = 2.75


@dataclass(frozen=True)
class Sums:
    """c times the N-th power of a sum of `length` values."""

    length: int
    stages: int
    c: Fraction

    def growth(self, stage: int) -> int:
        """Bits by which the sums of a stage, from 1 on, are longer than the signal: ceil(stage log2 length), exactly."""
        return int(self.length**stage - 1).bit_length()


@lru_cache(maxsize=64)
def sums_of(taps: Polynomial) -> Sums | None:
    """What the taps are the sums of, if they are."""
    degree = len(taps) - 1
    stages = round(taps[1] / taps[0]) if degree and taps[0] else 0  # the weights begin with 1, N
    if not 1 <= stages <= MOST_STAGES or degree % stages:
        return None
    length = degree // stages + 1
    c = sum(taps, Fraction(0)) / length**stages
    weights = _weights(length, stages)
    if any(abs(tap - c * weight) > TOLERANCE * weight * abs(c) for tap, weight in zip(taps, weights, strict=True)):
        return None
    return Sums(length, stages, c)


def _weights(length: int, stages: int) -> list[int]:
    """The coefficients of (1 + z^-1 + ... + z^-(length-1))^stages, by running sums."""
    weights = [1]
    for _ in range(stages):
        padded, total, summed = [*weights, *[0] * (length - 1)], 0, []
        for n, value in enumerate(padded):
            total += value - (padded[n - length] if n >= length else 0)
            summed.append(total)
        weights = summed
    return weights


def carries(ratio: Ratio) -> str:
    if refused := refused_recursion(ratio):
        return refused
    found = sums_of(ratio.b)
    if found is None:
        return "it is no running sum: its taps are not those of c (1 + z^-1 + ... + z^-(L-1))^N. A running sum is drawn whole"
    if (growth := found.growth(found.stages)) > MOST_GROWTH:
        return f"{found.stages} stages of {found.length} add {growth} bits to the signal, and {MOST_GROWTH} are possible"
    return ""


def build_section(draft: Draft, x: Ref) -> Ref:
    found = sums_of(draft.ratio.b)
    assert found is not None, "what cannot be carried is not drawn"
    signal = x
    for stage in range(1, found.stages + 1):
        signal = _stage(draft, stage, found, signal)
        if stage < found.stages and stage % A_ROW == 0:
            _wrap(draft, signal, stage)
    if found.c == 1:
        return signal
    column, row = _place(found.stages - 1)
    return draft.gain("c", float(found.c), signal, at=(column + STAGE + 0.5, row), part="b")


def _place(stages: int) -> tuple[float, float]:
    """The first column and row of the stage after so many."""
    row, column = divmod(stages, A_ROW)
    return column * STAGE, row * HEIGHT


def _stage(draft: Draft, stage: int, sums: Sums, x: Ref) -> Ref:
    column, row = _place(stage - 1)
    old = draft.delay(f"x{stage}", x, at=(column + 0.625, row + 1), n=sums.length)
    before = draft.delay(f"s{stage}d", at=(column + 2.5, row + 1), face="W")
    adders = [(column + 1.25, row), (column + 2, row)]
    s = draft.chain(f"s{stage}", [x, minus(old), before], at=adders, grow=sums.growth(stage))
    before.takes(s)
    return s


def _wrap(draft: Draft, signal: Ref, stage: int) -> None:
    """The wire from the end of a row to the beginning of the next."""
    left, below = _place(stage)
    right, row = _place(stage - 1)[0] + STAGE + 0.25, _place(stage - 1)[1]
    draft.trunk(signal, (right, row), (right, below - 0.875), (left - 0.5, below - 0.875), (left - 0.5, below))


def size(ratio: Ratio) -> Size:
    found = sums_of(ratio.b)
    assert found is not None, "what cannot be carried is not drawn"
    column, row = _place(found.stages - 1)
    wide = STAGE * min(found.stages, A_ROW)
    return Size(max(column + STAGE + (0.5 if found.c != 1 else 0.0), wide + 0.5), row + 1.25, row)


FORM = Form(
    name="running-sum",
    summary="moving averages and powers of them: one addition and one subtraction for any length, exact where it wraps",
    begins_with="numerator",
    build_section=build_section,
    docs=__doc__,
    carries=carries,
    exact_size=size,
)
