"""The L2 norm of a rational transfer function, without sums over its impulse response.

Step-down recursion turns B / A into a lattice-ladder of reflection coefficients k_i and taps v_i. With white input the
backward signals of the lattice are uncorrelated, and the i-th has the power 1 / prod(1 - k_j^2, j > i), so that

    N^2 = sum over i of v_i^2 / prod(1 - k_j^2, j > i)

(Oppenheim & Schafer, Discrete-Time Signal Processing, lattice filters; Mitra, tapped cascaded lattice). It holds for
any stable A; digits that poles near the circle cost are made up for by more digits.
"""

from math import inf
from typing import Any

from streamhost.filters.exact import Polynomial, to_mpf

FIRST_BITS = 256
MOST_BITS = 1 << 16
SIGNIFICANT_BITS = 24


def l2_norm(b: Polynomial, a: Polynomial) -> float:
    """sqrt(sum h[n]^2) of B / A with all poles inside the unit circle, rounded half-even to 24 significant bits.

    Exact ascending powers of z^-1, a[0] = 1.
    """
    import mpmath

    before: Any = inf
    bits = FIRST_BITS
    while bits <= MOST_BITS:
        with mpmath.workprec(bits):
            power = _power(_floats(b, len(a)), _floats(a, len(b)))
            # The digits that two precisions share are right, and far more than are kept.
            if power is not None and abs(power - before) <= power * mpmath.mpf(2) ** -100:
                break
            before = inf if power is None else power
        bits *= 2
    else:
        raise AssertionError("the norm of a stable filter was not found: a pole on the unit circle?")
    with mpmath.workprec(bits):
        root = mpmath.sqrt(power)
    with mpmath.workprec(SIGNIFICANT_BITS):
        return float(+root)


def _floats(polynomial: Polynomial, length: int) -> list[Any]:
    import mpmath

    return [*map(to_mpf, polynomial), *[mpmath.mpf(0)] * (length - len(polynomial))]


def _power(b: list[Any], a: list[Any]) -> Any:
    """N^2 of equally long lists, or None where the precision does not carry."""
    power: Any = 0
    backward: Any = 1
    for i in reversed(range(len(a))):
        k, tap = (a[i], b[i]) if i else (0, b[0])
        power += tap * tap * backward
        left = 1 - k * k
        if left <= 0:
            return None
        backward = backward / left
        b = [b[j] - tap * a[i - j] for j in range(i)]
        a = [(a[j] - k * a[i - j]) / left for j in range(i)]
    return power
