"""Stability decided exactly, on the coefficients or poles as they stand in float64."""

from collections import Counter
from collections.abc import Iterable, Iterator
from fractions import Fraction
from itertools import dropwhile
from math import lcm

from streamhost.filters.exact import Polynomial, exactly, stripped, to_multiple
from streamhost.filters.factors import Polynomials, ZerosPoles
from streamhost.filters.roots import roots_outside
from streamhost.filters.square_free import common_divisor

PRECISIONS = (256, 1024, 4096)
"""Bits in which the step-down is tried, with a bound of its error, before it is made exactly."""


def is_stable(ascending: Polynomial) -> bool:
    """Whether 1 / A(z) is stable: all roots of A inside the unit circle. Ascending powers of z^-1, a[0] not 0.

    Step-down recursion (Schur-Cohn test): stable if and only if every reflection coefficient is less than 1 in magnitude
    (Oppenheim & Schafer, lattice filters; Mitra, stability test by all-pass sections). In as many bits as tell, or exactly.
    """
    for bits in PRECISIONS if len(ascending) > 3 else ():
        if (told := _is_stable_to(ascending, bits)) is not None:
            return told
    return _is_stable_exactly(ascending)


def _is_stable_to(ascending: Polynomial, bits: int) -> bool | None:
    """None where these bits do not tell. The stages are integers of 2^-bits, each within `error` of the true one."""
    one = 1 << bits
    stage, error = [round(value / ascending[0] * one) for value in ascending], 1
    while len(stage) > 1:
        last = stage[-1]
        if abs(last) - error >= one:
            return False
        if (most := abs(last) + error) >= one:
            return None
        scale = one * one - last * last
        stepped = [(x * one - last * y << bits) // scale for x, y in zip(stage[:-1], stage[:0:-1], strict=True)]
        # Of the numerator x - k y, then of the quotient, whose denominator is at least 1 - most^2 and off by most^2 - k^2.
        above = error * (most + max(map(abs, stage))) // one + error + 1
        off = (most * most - last * last) // one + 1
        least = one - most * most // one - 1
        if least <= 0:
            return None
        largest = max(map(abs, stepped)) + 1
        stage, error = stepped, (above * one + largest * off) // least + 2
    return True


def _is_stable_exactly(ascending: Polynomial) -> bool:
    """The same on integers: each stage is divided by the first of the last but one, which leaves no remainder.

    The polynomial itself divides nothing. So the numbers grow with the order, and not with two to the power of it
    (E. Bareiss, Numerische Mathematik 13, 1969).
    """
    common = lcm(*(value.denominator for value in ascending))
    stage, divisor, following = [int(value * common) for value in ascending], 1, 1
    while len(stage) > 1:
        first, last = stage[0], stage[-1]
        if abs(last) >= abs(first):
            return False
        stage = [(first * x - last * y) // divisor for x, y in zip(stage[:-1], stage[:0:-1], strict=True)]
        divisor, following = following, stage[0]
    return True


def step_down(ascending: Polynomial, bits: int | None = None) -> Iterator[Polynomial]:
    """A_N, A_(N-1), ... A_1 of A = A_N, all beginning with 1; the last coefficient of A_m is the reflection coefficient k_m.

    A_(m-1) = (A_m - k_m z^-m A_m(1/z)) / (1 - k_m^2). It ends early with the first A_m, m > 1, whose k_m is 1 or -1,
    since no A_(m-1) exists then. Exact, or, for long polynomials, every coefficient to a multiple of 2^-bits, and k_m
    within 2^-(bits/2) of 1 or -1 taken as such.
    """
    least = Fraction(0) if bits is None else Fraction(1, 1 << bits // 2)
    stage = _to(bits, (value / ascending[0] for value in ascending))
    while len(stage) > 1:
        yield stage
        reflection = stage[-1]
        scale = 1 - reflection * reflection
        if abs(scale) <= least:
            return
        stage = _to(bits, ((x - reflection * y) / scale for x, y in zip(stage[:-1], stage[:0:-1], strict=True)))


def _to(bits: int | None, values: Iterable[Fraction]) -> Polynomial:
    return tuple(values) if bits is None else tuple(to_multiple(value, bits) for value in values)


def unstable_poles(factor: Polynomials | ZerosPoles) -> int:
    """How many poles of a factor lie on or outside the unit circle; 0 if and only if the factor is stable.

    Of polynomials, stable or not is decided by an exact test, and only the number of an unstable one rests on its
    roots (in 400 bits). Zeros that cancel poles cancel nothing here.
    """
    if isinstance(factor, ZerosPoles):
        return sum(Fraction(p.real) ** 2 + Fraction(p.imag) ** 2 >= 1 for p in factor.poles)
    denominator = stripped(exactly(factor.a))
    if is_stable(denominator):
        return 0
    return max(1, roots_outside(factor.a[: len(denominator)]))


def cancelled_poles(factor: Polynomials | ZerosPoles) -> int:
    """How many of the unstable poles of a factor its own zeros cancel exactly."""
    if isinstance(factor, ZerosPoles):
        shared_roots = Counter(factor.zeros) & Counter(factor.poles)
        return sum(Fraction(p.real) ** 2 + Fraction(p.imag) ** 2 >= 1 for p in shared_roots.elements())
    if not unstable_poles(factor) or not any(factor.b):
        return 0
    numerator = exactly(dropwhile(lambda value: value == 0, factor.b))
    shared = common_divisor(stripped(exactly(factor.a)), stripped(numerator))
    return sum(roots_on_and_outside(shared))


def roots_on_and_outside(ascending: Polynomial) -> tuple[int, int]:
    """How many roots of A lie on the unit circle, and how many outside it. Ascending powers of z^-1, a[0] not 0.

    A root on the circle is one of A and of A reversed: all such lie in their greatest common divisor, which is exact, and
    whose other roots come in pairs r, 1/r. Neither nearness nor rounding takes part in which roots are on the circle.
    """
    denominator = stripped(ascending)
    if is_stable(denominator):
        return 0, 0
    shared = common_divisor(denominator, denominator[::-1])
    pairs = roots_outside(shared, on_circle=False) if len(shared) > 1 else 0
    on = len(shared) - 1 - 2 * pairs
    return on, max(roots_outside(denominator) - on, 0 if on else 1)
