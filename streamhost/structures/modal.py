"""State spaces of first and second order in normal coordinates: what the form `normal` computes.

A complex pair of poles sigma + j omega is A = [[sigma, omega], [-omega, sigma]]: with s = s1 + j s2 the states are
s[n+1] = q s[n] + beta x[n], q = sigma - j omega. White input of power 1 gives E |s|^2 = |beta|^2 / (1 - |q|^2) and
E s^2 = beta^2 / (1 - q^2). Both states have the power 1 where the first is 2 and the second imaginary.
"""

from fractions import Fraction
from functools import lru_cache
from typing import Any

from streamhost.filters.exact import to_mpf
from streamhost.structures.division import Ratio
from streamhost.structures.gramians import BITS, StateSpace, rounded_space


def discriminant(ratio: Ratio) -> Fraction:
    """Above 0 for two real poles, below 0 for a complex pair; of second order."""
    a = ratio.padded[1]
    return a[1] * a[1] / 4 - a[2]


@lru_cache(maxsize=256)
def normal(ratio: Ratio) -> StateSpace:
    """The state space of a stable section of order 1 or 2 with states of power 1; a double pole has none."""
    import mpmath

    with mpmath.workprec(BITS):
        if ratio.order == 2 and discriminant(ratio) < 0:
            return _pair(ratio)
        return _alone(ratio)


def _after_direct(ratio: Ratio) -> list[Any]:
    """c_1, c_2 of B / A = b0 + (c_1 z^-1 + c_2 z^-2) / A."""
    b, a = ratio.padded
    return [to_mpf(b[k] - b[0] * a[k]) for k in range(1, ratio.order + 1)]


def _pair(ratio: Ratio) -> StateSpace:
    import mpmath

    first, second = _after_direct(ratio)
    omega = mpmath.sqrt(to_mpf(-discriminant(ratio)))
    q = mpmath.mpc(to_mpf(-ratio.a[1] / 2), -omega)
    leaning = 1 - q * q
    size = mpmath.sqrt(2 * to_mpf(1 - ratio.a[2]))
    beta = size * mpmath.sqrt(mpmath.mpc(0, 1) * leaning / abs(leaning))
    # B / A - b0 has the residue R at q, and y = Re(conj(gamma) s) has conj(gamma) beta / 2 there.
    gamma = mpmath.conj(2 * (first * q + second) / (q - mpmath.conj(q)) / beta)
    a = mpmath.matrix([[q.real, omega], [-omega, q.real]])
    return rounded_space(a, mpmath.matrix([beta.real, beta.imag]), mpmath.matrix([[gamma.real, gamma.imag]]), ratio.b[0])


def _alone(ratio: Ratio) -> StateSpace:
    """Real poles, each a state of its own."""
    import mpmath

    if ratio.order == 1:
        poles = [to_mpf(-ratio.a[1])]
        residues = _after_direct(ratio)
    else:
        first, second = _after_direct(ratio)
        root = mpmath.sqrt(to_mpf(discriminant(ratio)))
        middle = to_mpf(-ratio.a[1] / 2)
        poles = [middle + root, middle - root]
        residues = [(first * p + second) / (p - q) for p, q in (poles, poles[::-1])]
    b = [mpmath.sqrt(1 - p * p) for p in poles]
    c = [residue / value for residue, value in zip(residues, b, strict=True)]
    return rounded_space(mpmath.diag(poles), mpmath.matrix(b), mpmath.matrix([c]), ratio.b[0])
