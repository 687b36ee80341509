"""The frequency response of one factor, accurate also where poles and zeros crowd at z = 1 or z = -1.

Near 0 Hz and near rate / 2 the powers of z^-1 all but cancel. Factors of first and second order are therefore
expanded about the nearer of z = 1 and z = -1: with s = 1 or -1 and t = 1 - s z^-1, which `expm1` gives to full
relative accuracy, a root r contributes 1 - r z^-1 = (1 - r s) + r s t. Longer polynomials are summed in powers of
z^-1 where a bound on the rounding allows it, and in whole numbers of WIDE_BITS bits elsewhere.
"""

from dataclasses import dataclass
from fractions import Fraction
from math import fsum

import numpy as np
import numpy.typing as npt

from streamhost.filters.factors import Polynomials, ZerosPoles

Reals = npt.NDArray[np.float64]
Complexes = npt.NDArray[np.complex128]

WIDE_BITS = 512
RELATIVE_ERROR = 1e-12


@dataclass(frozen=True)
class Circle:
    """Points of the unit circle: frequencies (n,) in Hz at a rate, s and t of each as above."""

    hertz: Reals
    rate: float
    sign: Reals
    distance: Complexes

    @property
    def inverse(self) -> Complexes:
        """z^-1."""
        return np.asarray(np.exp(-2j * np.pi * self.hertz / self.rate), np.complex128)


def circle(hertz: Reals, rate: float) -> Circle:
    """Frequencies (n,) from 0 to rate / 2."""
    low = hertz <= rate / 4
    offset = np.where(low, hertz, hertz - rate / 2)
    distance = -np.expm1(-2j * np.pi * offset / rate)
    return Circle(hertz, rate, np.where(low, 1.0, -1.0), np.asarray(distance, np.complex128))


def of_polynomials(factor: Polynomials, points: Circle) -> Complexes:
    """B / A at each point; infinite or NaN where A is 0."""
    return _polynomial(factor.b, points) / _polynomial(factor.a, points)


def of_zeros_poles(factor: ZerosPoles, points: Circle) -> Complexes:
    """gain z^-delay prod(1 - z_i z^-1) / prod(1 - p_i z^-1) at each point."""
    above = np.full(points.hertz.shape, factor.gain, np.complex128)
    below = np.ones(points.hertz.shape, np.complex128)
    for zero in factor.zeros:
        above *= _root(zero, points)
    for pole in factor.poles:
        below *= _root(pole, points)
    if factor.delay:
        above *= points.inverse**factor.delay
    return above / below


def _root(root: complex, points: Circle) -> Complexes:
    at_point = root * points.sign
    return (1 - at_point) + at_point * points.distance


def _polynomial(coefficients: tuple[float, ...], points: Circle) -> Complexes:
    if len(coefficients) <= 3:
        return _short(coefficients, points)
    return _long(coefficients, points)


def _short(coefficients: tuple[float, ...], points: Circle) -> Complexes:
    """c0 + c1 z^-1 + c2 z^-2 about z = s, the coefficients of that expansion rounded once."""
    c0, c1, c2 = coefficients + (0.0,) * (3 - len(coefficients))
    low = points.sign > 0
    constant = np.where(low, fsum((c0, c1, c2)), fsum((c0, -c1, c2)))
    slope = np.where(low, fsum((-c1, -c2, -c2)), fsum((c1, -c2, -c2)))
    return constant + points.distance * (slope + points.distance * c2)


def _long(coefficients: tuple[float, ...], points: Circle) -> Complexes:
    inverse = points.inverse
    total = np.zeros(inverse.shape, np.complex128)
    for coefficient in reversed(coefficients):
        total = total * inverse + coefficient
    # A Horner step rounds a complex product and a sum (under 4 half-eps), and z^-1 itself is off by the three
    # roundings of an angle of up to pi and one of the exponential (under 11 half-eps): 8 eps a step holds both.
    bound = 8 * len(coefficients) * np.finfo(np.float64).eps * fsum(abs(c) for c in coefficients)
    poor = np.flatnonzero(bound > RELATIVE_ERROR * np.abs(total))
    total[poor] = _wide(coefficients, points.hertz[poor], points.rate)
    return total


def _wide(coefficients: tuple[float, ...], hertz: Reals, rate: float) -> Complexes:
    """Horner's rule on whole numbers with WIDE_BITS fraction bits; off by at most a few 2^-WIDE_BITS a step."""
    import mpmath

    one = 1 << WIDE_BITS
    steps = [int(Fraction(coefficient) * one) for coefficient in reversed(coefficients)]
    values = []
    with mpmath.workprec(WIDE_BITS + 32):
        for frequency in hertz:
            half_turns = 2 * mpmath.mpf(float(frequency)) / mpmath.mpf(rate)
            cosine, sine = int(mpmath.cospi(half_turns) * one), int(mpmath.sinpi(half_turns) * one)
            real = imaginary = 0
            for step in steps:
                real, imaginary = (
                    ((real * cosine + imaginary * sine) >> WIDE_BITS) + step,
                    (imaginary * cosine - real * sine) >> WIDE_BITS,
                )
            values.append(complex(real / one, imaginary / one))
    return np.array(values, np.complex128)
