"""State spaces in many digits: coordinates in which the states have power 1 and their roundings are heard least.

With x[n+1] = A x[n] + B u[n], y[n] = C x[n] + D u[n], the states of white input of power 1 have the covariance
K = A K A' + B B', and errors of power 1 in the states are heard with the power trace W, W = A' W A + C' C. In coordinates
with K = I (those of the normalized lattice) the eigenvalues of W are the squares of the second-order modes mu_i, which no
change of coordinates changes, and (mu_1 + ... + mu_N)^2 / N is the least noise of all state spaces whose states have
power 1 (C. Mullis and R. Roberts, IEEE Trans. CAS-23, 1976; S. Hwang, IEEE Trans. ASSP-25, 1977).

mpmath's numbers are integers of any size with an exponent: the digits are the same on every machine.
"""

from dataclasses import dataclass
from fractions import Fraction
from functools import lru_cache
from typing import Any

from streamhost.filters.exact import Polynomial, to_mpf
from streamhost.structures.division import Ratio

BITS = 400
LEAST_MODE = Fraction(1, 1 << 16)
"""Of the largest: smaller modes are taken as that, so that a state which nothing hears stays a state."""

MOST_DOUBLINGS = 128
"""A pole of float64 coefficients lies some 2^-54 or further from the circle."""

NOTHING = Fraction(1, 1 << 150)
"""What is below stands for 0: far above the rounding errors of 400 bits, far below any coefficient of float64."""


@dataclass(frozen=True)
class StateSpace:
    """A by rows, B, C and D of one input and one output, each entry rounded once to float64."""

    a: tuple[tuple[float, ...], ...]
    b: tuple[float, ...]
    c: tuple[float, ...]
    d: float


def rounded(value: Any) -> float:
    return float(value) if abs(value) > to_mpf(NOTHING) else 0.0


@lru_cache(maxsize=256)
def quietest(ratio: Ratio) -> StateSpace:
    """The state space of a stable filter with states of power 1 whose roundings are heard least; all b_i >= 0.

    From K = I, W = Q diag(mu_i^2) Q' with eigenvalues ascending, the coordinates are x = Q L V' x' with
    L^-2 = diag(N mu_i / sum mu), and V turns plane after plane so that V L^-2 V', the new K, has ones on its diagonal.
    """
    import mpmath

    with mpmath.workprec(BITS):
        a, b, c = orthonormal(ratio)
        squares, turned = mpmath.eigsy(observability(a, c))
        stretch = [mpmath.sqrt(share) for share in shares([mpmath.sqrt(max(square, 0)) for square in squares])]
        equal = equalizing([value * value for value in stretch])
        into = mpmath.diag([1 / value for value in stretch]) * equal.T
        back = equal * mpmath.diag(stretch)
        return rounded_space(back * turned.T * a * turned * into, back * turned.T * b, c * turned * into, ratio.b[0])


@lru_cache(maxsize=256)
def least_noise(ratio: Ratio) -> float:
    """The power at the output of roundings of power 1 in the quietest states of power 1: (mu_1 + ... + mu_N)^2 / N."""
    import mpmath

    with mpmath.workprec(BITS):
        a, _, c = orthonormal(ratio)
        squares = mpmath.eigsy(observability(a, c), eigvals_only=True)
        return float(sum(mpmath.sqrt(max(square, 0)) for square in squares) ** 2 / ratio.order)


def heard(space: StateSpace) -> float:
    """The power at the output of roundings of power 1 in the states; A must be a contraction."""
    import mpmath

    with mpmath.workprec(BITS):
        w = observability(mpmath.matrix(space.a), mpmath.matrix([space.c]))
        return float(sum(w[i, i] for i in range(w.rows)))


def rounded_space(a: Any, b: Any, c: Any, d: Fraction) -> StateSpace:
    """Each entry rounded; states turned round so that no b_i is negative."""
    order = a.rows
    sign = [-1 if rounded(b[i]) < 0 else 1 for i in range(order)]
    rows = tuple(tuple(rounded(sign[i] * sign[j] * a[i, j]) for j in range(order)) for i in range(order))
    return StateSpace(
        rows, tuple(rounded(sign[i] * b[i]) for i in range(order)), tuple(rounded(sign[i] * c[i]) for i in range(order)),
        float(d),
    )


def orthonormal(ratio: Ratio) -> tuple[Any, Any, Any]:
    """A, B and C of a stable B / A in the coordinates of the normalized lattice, where K = I.

    The lattice: f_(m-1) = f_m - k_m s_m, g_m = k_m f_(m-1) + s_m, s_m[n] = g_(m-1)[n-1], f_N = x, g_0 = f_0,
    y = sum v_m g_m; s_m has the power 1 / prod(1 - k_j^2, j >= m). All is rational but the roots of the powers.
    """
    import mpmath

    k, v = stepped_down(ratio)
    order = ratio.order
    rest = [Fraction(1)] * (order + 1)
    for m in reversed(range(order)):
        rest[m] = rest[m + 1] * (1 - k[m] * k[m])
    forward = [[-k[j] if j >= m else Fraction(0) for j in range(order)] + [Fraction(1)] for m in range(order)]
    backward = [forward[0]]
    for m in range(order):
        backward.append([k[m] * value + (j == m) for j, value in enumerate(forward[m])])
    output = [sum((v[m] * row[j] for m, row in enumerate(backward)), Fraction(0)) for j in range(order)]
    root = [mpmath.sqrt(to_mpf(rest[m])) for m in range(order)]
    a = mpmath.matrix(order, order)
    for i in range(order):
        for j in range(order):
            a[i, j] = to_mpf(backward[i][j]) * root[i] / root[j]
    b = mpmath.matrix([to_mpf(backward[i][order]) * root[i] for i in range(order)])
    c = mpmath.matrix([[to_mpf(output[j]) / root[j] for j in range(order)]])
    return a, b, c


def stepped_down(ratio: Ratio) -> tuple[Polynomial, Polynomial]:
    """Reflection coefficients k_1 ... k_N and taps v_0 ... v_N, exact (Gray and Markel, IEEE Trans. AU-21, 1973)."""
    order = ratio.order
    b, a = map(list, ratio.padded)
    k, v = [Fraction(0)] * order, [Fraction(0)] * (order + 1)
    for m in range(order, 0, -1):
        k[m - 1], v[m] = a[m], b[m]
        b = [b[j] - b[m] * a[m - j] for j in range(m)]
        a = [(a[j] - a[m] * a[m - j]) / (1 - a[m] * a[m]) for j in range(m)]
    v[0] = b[0]
    return tuple(k), tuple(v)


def observability(a: Any, c: Any) -> Any:
    """W = sum of (A')^n C' C A^n by doubling the number of its terms; A is a contraction, so that no step grows."""
    import mpmath

    w, power = c.T * c, a
    for _ in range(MOST_DOUBLINGS):
        if max(abs(value) for value in power) < mpmath.mpf(2) ** -(BITS // 2):
            return w
        w = w + power.T * w * power
        power = power * power
    raise AssertionError("the states of a stable filter die out: a pole on the unit circle?")


def shares(modes: list[Any]) -> list[Any]:
    """N mu_i / sum mu; 1 each where all are 0."""
    largest = max(modes)
    if largest <= to_mpf(NOTHING):
        return [1 for _ in modes]
    kept = [max(mode, largest * to_mpf(LEAST_MODE)) for mode in modes]
    return [len(kept) * mode / sum(kept) for mode in kept]


def equalizing(diagonal: list[Any]) -> Any:
    """An orthogonal V for which V diag V' has ones on its diagonal; the diagonal's mean is 1.

    Row by row: a turn in the plane of the row and the first later row on the other side of 1, by the smaller angle.
    """
    import mpmath

    order = len(diagonal)
    v, m = mpmath.eye(order), mpmath.diag(diagonal)
    for i in range(order - 1):
        off = m[i, i] - 1
        if abs(off) < to_mpf(NOTHING):
            continue
        j = next(j for j in range(i + 1, order) if (m[j, j] - 1) * off < 0)
        other = m[j, j] - 1
        root = mpmath.sqrt(m[i, j] ** 2 - other * off)
        # other t^2 + 2 m_ij t + off = 0 for the tangent t, by the formula that does not cancel
        tangent = -off / (m[i, j] + (root if m[i, j] >= 0 else -root))
        cosine = 1 / mpmath.sqrt(1 + tangent**2)
        turn = mpmath.eye(order)
        turn[i, i] = turn[j, j] = cosine
        turn[i, j], turn[j, i] = tangent * cosine, -tangent * cosine
        v, m = turn * v, turn * m * turn.T
    return v
