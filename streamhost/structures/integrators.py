"""What the forms of two summing registers share: which sections they carry, and the section of first order.

Of first order there is one register, and nothing to choose:

    u[n] = u[n-1] + k (x[n] - u[n-1]),   y[n] = d x[n] + c1 u[n-1],   k = A(1) = 1 + a1, c1 = B(1) / A(1) - b0, d = b0
"""

from fractions import Fraction
from typing import Any

from streamhost.diagram.builder import Ref, minus
from streamhost.filters import Polynomials
from streamhost.filters.exact import Polynomial, to_mpf
from streamhost.structures.division import Ratio
from streamhost.structures.form import Draft, Size, delays_down

Y, C = 4.5, 3.875
"""Columns of the chain of adders on the right, and of the coefficients before it."""

ROW = 1.625
"""The row of the register of a section of first order."""

FAR = ("the poles of a section are nearer to z = -1 than to z = 1, and its registers become several times larger than its "
       "input and output.")


def carries(ratio: Ratio) -> str:
    if ratio.order > 2:
        return f"it is of order {ratio.order}, and there are two registers at most"
    if ratio.order and not ratio.is_recursive:
        return "it has no recursion"
    if total(ratio.a) <= 0:
        return "1 + a1 + a2 is not above 0 (a real pole at z = 1 or beyond it), and the form is made of its root"
    return ""


def far(ratio: Ratio) -> tuple[str, ...]:
    """A sentence where the poles are nearer to z = -1."""
    return (FAR,) if ratio.order == 2 and ratio.padded[1][1] > 0 else ()


def size(section: Polynomials, rows: float) -> Size:
    """Of a section whose second order takes so many rows."""
    return Size(Y, (0.0, ROW, rows)[delays_down(section)])


def constant(draft: Draft, x: Ref) -> Ref:
    return draft.gain("d", float(draft.ratio.b[0]), x, at=(Y / 2, 0), part="d")


def mixed(ratio: Ratio) -> tuple[Any, Any]:
    """b1 - b0 a1 and B(1) / A(1) - b0 in the working precision: what c1 and c2 are made of."""
    b, a = ratio.padded
    return to_mpf(b[1] - b[0] * a[1]), to_mpf(total(b) / total(a) - b[0])


def total(polynomial: Polynomial) -> Fraction:
    """The value at z = 1."""
    return sum(polynomial, Fraction(0))


def first_order(draft: Draft, x: Ref, name: str) -> Ref:
    """A section of first order; `name` is that of its coefficient k."""
    ratio = draft.ratio
    k = total(ratio.a)
    u1 = draft.delay("du", at=(2.875, ROW))
    draft.trunk(x, (0, 0), (0, ROW), (0, 0), (1.5, 0))
    error = draft.add("h", [x, minus(u1)], at=(0.5, ROW))
    product = draft.gain(name, float(k), error, at=(1.25, ROW), part="k")
    u1.takes(draft.add("u", [u1, product], at=(2.0, ROW)))
    heard = draft.gain("c1", float(total(ratio.b) / k - ratio.b[0]), u1, at=(C, ROW), part="c")
    direct = draft.gain("d", float(ratio.b[0]), x, at=(Y / 2, 0), part="d")
    return draft.climb("y", [heard, direct], column=Y, rows=[ROW, 0.0])
