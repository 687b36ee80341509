"""Curves fitted by least squares on the response: what made the table in `fitted.py`, which is what is used.

    python -c "from streamhost.filters.curves.fitting import module_text; print(module_text(), end='')"

Roots below LOW of the rate are mapped by z = exp(s / rate) and stay. The others are free: as many sections of second
order as FREE says, started from their own exp(s / rate). What is least is the squared difference in decibels, its mean
removed, at as many points on a logarithmic as on a linear axis. Started from one place and rounded to twelve digits,
the fit is the same on every machine but for what flat directions leave open; therefore the table is kept.
"""

from collections.abc import Mapping
from dataclasses import dataclass
from math import atanh, tanh

import numpy as np
import numpy.typing as npt

from streamhost.filters.curves.analogue import CURVES, Curve, Roots

Array = npt.NDArray[np.float64]

RATES = (44100, 48000, 88200, 96000)
LOW = 0.02
POINTS = 60
# Beyond what is heard a fit is asked for only where the rate leaves room for all that the standard states.
HEARD_HZ = 20000.0
DIGITS = 12
# A started root is kept this far from the edge of its range, where the mapping onto it has no slope.
INNERMOST = 0.999
SPARE_ROOTS = (-0.5, -0.4, -0.3, -0.2)


@dataclass(frozen=True)
class Free:
    """How many free zeros and poles a fit has, both even. The order is theirs and that of the roots that stay."""

    zeros: int
    poles: int


FREE: Mapping[str, Free] = {
    "a-weighting": Free(2, 2),
    "c-weighting": Free(2, 2),
    "itu-r-468": Free(4, 6),
    "phono-replay": Free(2, 2),
    "phono-replay, 7950 us": Free(2, 2),
    "fm-de-emphasis, 50 us": Free(2, 2),
    "fm-de-emphasis, 75 us": Free(2, 2),
}
"""The networks' own numbers of poles, but for one more pole in `phono-replay` and `fm-de-emphasis`."""


@dataclass(frozen=True)
class Fitted:
    """Zeros and poles in z; of a conjugate pair the upper one only."""

    zeros: Roots
    poles: Roots


def fitted(name: str, rate: float) -> Fitted:
    """The least-squares fit of a curve of CURVES at a rate."""
    from scipy.optimize import least_squares

    curve, free = CURVES[name], FREE[name]
    hertz = _points(curve, rate)
    inverse = np.exp(-2j * np.pi * hertz / rate)
    zeros, poles = _mapped(curve.zeros, rate), _mapped(curve.poles, rate)
    still = _decibels_of_roots(zeros.still, inverse) - _decibels_of_roots(poles.still, inverse) - curve.decibels(hertz)
    start = [*_started(zeros.free, free.zeros), *_started(poles.free, free.poles)]

    def difference(shape: Array) -> Array:
        moved = _decibels(shape[: free.zeros], inverse) - _decibels(shape[free.zeros :], inverse)
        return np.asarray(still + moved - np.mean(still + moved))

    best = least_squares(difference, start, xtol=1e-12, ftol=1e-12, gtol=1e-12, max_nfev=1000).x
    found_zeros = [*zeros.still, *_upper_roots(best[: free.zeros])]
    found_poles = [*poles.still, *_upper_roots(best[free.zeros :])]
    return Fitted(tuple(map(_rounded, found_zeros)), tuple(map(_rounded, found_poles)))


def module_text() -> str:
    """The text of `fitted.py`."""
    lines = [
        '"""What `fitting.module_text` found: zeros and poles of each curve at each rate; see there."""',
        "",
        "from collections.abc import Mapping",
        "",
        "from streamhost.filters.curves.fitting import Fitted",
        "",
        "FITTED: Mapping[tuple[str, float], Fitted] = {",
    ]
    for name in CURVES:
        for rate in RATES:
            found = fitted(name, rate)
            lines += [f'    ("{name}", {rate}): Fitted(', *_root_lines(found.zeros), *_root_lines(found.poles), "    ),"]
    return "\n".join([*lines, "}", ""])


@dataclass(frozen=True)
class _Mapped:
    still: list[complex]
    free: list[complex]


def _points(curve: Curve, rate: float) -> Array:
    low, high = curve.band_hz
    if high >= rate / 2:
        high = HEARD_HZ
    return np.concatenate([np.geomspace(low, high, POINTS), np.linspace(low, high, POINTS)])


def _mapped(roots: Roots, rate: float) -> _Mapped:
    """Upper roots and real ones, in z; zero frequency comes to exactly 1."""
    upper = [(root, complex(np.exp(root / rate))) for root in roots if root.imag >= 0]
    limit = 2 * np.pi * LOW * rate
    return _Mapped([z for s, z in upper if abs(s) < limit], [z for s, z in upper if abs(s) >= limit])


def _started(roots: list[complex], count: int) -> list[float]:
    """Two numbers for each section of two roots; where roots are missing, SPARE_ROOTS fill up."""
    pairs = [(root, root.conjugate()) for root in roots if root.imag > 0]
    real = [root for root in roots if root.imag == 0]
    real += [complex(root) for root in SPARE_ROOTS[: count - 2 * len(pairs) - len(real)]]
    pairs += list(zip(real[::2], real[1::2], strict=True))
    assert 2 * len(pairs) == count
    return [number for first, second in pairs for number in _shape(first, second)]


def _shape(first: complex, second: complex) -> tuple[float, float]:
    """Two free numbers for 1 + c1 z^-1 + c2 z^-2 with both roots inside the unit circle; undone by `_section`."""
    c1, c2 = -(first + second).real, (first * second).real
    return _open(c2), _open(c1 / (1 + c2))


def _open(part: float) -> float:
    return atanh(max(-INNERMOST, min(INNERMOST, part)))


def _section(shape: Array) -> tuple[float, float]:
    c2 = tanh(shape[0])
    return (1 + c2) * tanh(shape[1]), c2


def _decibels(shapes: Array, inverse: npt.NDArray[np.complex128]) -> Array:
    total = np.zeros(inverse.shape)
    for i in range(0, len(shapes), 2):
        c1, c2 = _section(shapes[i : i + 2])
        total += 20 * np.log10(np.abs(1 + c1 * inverse + c2 * inverse * inverse))
    return total


def _decibels_of_roots(real: list[complex], inverse: npt.NDArray[np.complex128]) -> Array:
    total = np.zeros(inverse.shape)
    for root in real:
        assert root.imag == 0, "only real roots stay"
        total += 20 * np.log10(np.abs(1 - root * inverse))
    return total


def _upper_roots(shapes: Array) -> list[complex]:
    roots: list[complex] = []
    for i in range(0, len(shapes), 2):
        c1, c2 = _section(shapes[i : i + 2])
        discriminant = c1 * c1 / 4 - c2
        if discriminant < 0:
            roots.append(complex(-c1 / 2, (-discriminant) ** 0.5))
        else:
            roots += [complex(-c1 / 2 + sign * discriminant**0.5) for sign in (1, -1)]
    return roots


def _rounded(root: complex) -> complex:
    return complex(*(float(f"{part:.{DIGITS}g}") for part in (root.real, root.imag)))


def _root_lines(roots: Roots) -> list[str]:
    """The source of a tuple, three roots a line."""
    texts = [_text(root) for root in roots]
    rows = [", ".join(texts[i : i + 3]) for i in range(0, len(texts), 3)]
    return ["        (", *(f"            {row}," for row in rows), "        ),"]


def _text(root: complex) -> str:
    return f"{root.real!r} + {root.imag!r}j" if root.imag else f"{root.real!r}"
