"""What is wanted: a transfer function with a sample rate. It knows nothing of structure or arithmetic."""

from collections.abc import Iterable
from dataclasses import dataclass
from fractions import Fraction

import numpy as np
import numpy.typing as npt

from streamhost.errors import FilterError
from streamhost.filters import entry, response, stability
from streamhost.filters.equation import coefficients
from streamhost.filters.exact import ONE, Polynomial, exactly, from_roots, product, rounded, scaled, stripped
from streamhost.filters.factors import Codes, Polynomials, ZerosPoles
from streamhost.filters.roots import roots

Factor = Polynomials | ZerosPoles


@dataclass(frozen=True)
class Filter:
    """A transfer function H(z), the product of its factors, at a sample rate in hertz.

    Factors are kept as they were given, so that nothing is lost before a structure needs another description.
    `sections_given`: every factor is a section of first or second order, in the order that was asked for.
    `codes`: the integers that the sections were given as, if they were.
    Made by the class methods, which check what they are given; all of them raise FilterError.
    """

    rate: float
    factors: tuple[Factor, ...]
    sections_given: bool
    codes: Codes | None = None

    @classmethod
    def from_coefficients(cls, b: object, a: object = (1.0,), *, rate: object) -> "Filter":
        """B(z) / A(z) from lists in ascending powers of z^-1; a[0] is divided out, each quotient rounded once."""
        numerator, denominator = entry.numbers(b, "b"), entry.numbers(a, "a")
        if denominator[0] == 0:
            raise FilterError(f"a[0] is 0; the first of the {len(denominator)} numbers in a must not be 0.")
        factor = _normalized(stripped(numerator), stripped(denominator))
        return cls(entry.rate(rate), (factor,), max(len(factor.b), len(factor.a)) <= 3)

    @classmethod
    def from_equation(cls, text: object, *, rate: object) -> "Filter":
        """The filter of a difference equation such as y[n] = 0.5 x[n] + 0.5 x[n-1] + 0.9 y[n-1].

        Terms may stand on either side, 1/3 is exact, the coefficient of y[n] is divided out exactly, and each quotient
        is rounded once. The syntax is told in `streamhost.filters.equation`.
        """
        return cls.from_coefficients(*coefficients(text), rate=rate)

    @classmethod
    def from_sections(cls, sos: object, *, rate: object) -> "Filter":
        """A cascade from an (n, 6) table with rows b0 b1 b2 a0 a1 a2; a0 is divided out."""
        rows = entry.sections(sos)
        for i, row in enumerate(rows):
            if row[3] == 0:
                raise FilterError(f"a0 of sections[{i}] is 0; the fourth number of a section must not be 0.")
        factors = tuple(_normalized(tuple(row[:3]), tuple(row[3:])) for row in rows)
        return cls(entry.rate(rate), factors, sections_given=True)

    @classmethod
    def from_zeros_poles(cls, z: object, p: object, k: object, *, rate: object) -> "Filter":
        """H(z) = k prod(z - z_i) / prod(z - p_i), as scipy writes it; complex roots in exactly conjugate pairs.

        Missing zeros are zeros at infinity: pure delays. More zeros than poles would look ahead and are refused.
        """
        zeros, poles = entry.roots(z, "zeros"), entry.roots(p, "poles")
        if len(zeros) > len(poles):
            raise FilterError(
                f"there are {len(zeros)} zeros and {len(poles)} poles; as many poles as zeros are needed at least, "
                "or the filter would look ahead. Poles at 0 are written out: a finite response has as many as zeros."
            )
        factor = ZerosPoles(
            zeros=tuple(zero for zero in zeros if zero != 0),
            poles=tuple(pole for pole in poles if pole != 0),
            gain=float(entry.number(k, "factor")),
            delay=len(poles) - len(zeros),
        )
        return cls(entry.rate(rate), (factor,), sections_given=False)

    @classmethod
    def from_codes(cls, codes: object, word: str, *, rate: object) -> "Filter":
        """A cascade from integers as firmware holds them: rows b0 b1 b2 a0 a1 a2, or b0 b1 b2 a1 a2.

        `word` is such as "Q4.12": a code is the value times 2^12. a is in the transfer function's sign, a0 the
        code of 1.
        """
        rows = entry.codes(codes, word)
        one = 1 << entry.word(word)[1]
        factors = []
        for row in rows:
            values = [Fraction(code, one) for code in row]
            factors.append(_normalized(tuple(values[:3]), tuple(values[3:])))
        return cls(entry.rate(rate), tuple(factors), sections_given=True, codes=Codes(rows, word))

    @classmethod
    def cascade(cls, filters: Iterable["Filter"]) -> "Filter":
        """The product of filters at one rate, in their order.

        Codes stand only beside codes of the same word: their word becomes the word of all coefficients.
        """
        parts = tuple(filters)
        if not parts:
            raise FilterError("a cascade of no filters was asked for; at least one is needed.")
        rates = sorted({part.rate for part in parts})
        if len(rates) > 1:
            raise FilterError(
                f"the filters of a cascade have the rates {', '.join(f'{r:g}' for r in rates)} Hz; all must have one."
            )
        return cls(
            rates[0],
            tuple(factor for part in parts for factor in part.factors),
            all(part.sections_given for part in parts),
            _joined([part.codes for part in parts]),
        )

    @property
    def order(self) -> int:
        """The higher of the degrees of B and A in z^-1: the delays that a canonic form needs."""
        degrees = [_degrees(factor) for factor in self.factors]
        return max(sum(b for b, _ in degrees), sum(a for _, a in degrees))

    @property
    def is_recursive(self) -> bool:
        """Whether any denominator has a coefficient beyond a0."""
        return any(a > 0 for _, a in map(_degrees, self.factors))

    def sections(self) -> tuple[Polynomials, ...]:
        """The sections as they were given; FilterError where the filter was not given as sections."""
        if not self.sections_given:
            raise FilterError(
                f"this filter of order {self.order} was not given as sections of first and second order; "
                "choose a pairing and an ordering to divide it."
            )
        return tuple(factor for factor in self.factors if isinstance(factor, Polynomials))

    def whole(self) -> tuple[tuple[float, ...], tuple[float, ...]]:
        """(b, a) of the product of all factors, multiplied exactly and rounded once; a[0] is 1.

        Trailing zeros are left out. The rounding can move poles that lie close together far, even out of the
        unit circle; `unstable_poles` of a filter made from these lists tells.
        """
        numerator, denominator = self.ratio()
        return rounded(numerator), rounded(denominator)

    def ratio(self) -> tuple[Polynomial, Polynomial]:
        """(b, a) of the product of all factors in ascending powers of z^-1, exact; a[0] is 1, trailing zeros left out."""
        numerator, denominator = ONE, ONE
        for factor in self.factors:
            b, a = _expanded(factor)
            numerator, denominator = product(numerator, b), product(denominator, a)
        return stripped(numerator), stripped(denominator)

    def zeros_poles(self) -> ZerosPoles:
        """Zeros, poles and gain of the product of all factors; what cancels is kept.

        Each factor given as polynomials is solved on its own, its roots accurate to about one rounding. Orders
        above some 30 take seconds.
        """
        parts = [_solved(factor) for factor in self.factors]
        gain = Fraction(1)
        for part in parts:
            gain *= Fraction(part.gain)
        if gain == 0:
            return ZerosPoles((), _gathered(part.poles for part in parts), 0.0)
        return ZerosPoles(
            _gathered(part.zeros for part in parts),
            _gathered(part.poles for part in parts),
            rounded((gain,))[0],
            sum(part.delay for part in parts),
        )

    def response(self, frequencies_hz: npt.ArrayLike) -> npt.NDArray[np.complex128]:
        """H at frequencies from 0 to rate / 2 in Hz, in the shape of the frequencies.

        Each root contributes a relative error of a few roundings (2^-53) times its distance from z = 1 or z = -1,
        whichever the frequency is nearer to, over its distance from the frequency's point on the circle; in a
        section given as polynomials both roots' ratios multiply. A polynomial of higher order contributes at most
        1e-12, as long as its value is above 1e-130 of its coefficients' sum. Infinite or NaN on a pole.
        """
        try:
            hertz = np.asarray(frequencies_hz, np.float64)
        except (TypeError, ValueError):
            raise FilterError(f"a response at {frequencies_hz!r} was asked for; frequencies are numbers.") from None
        outside = hertz[~((hertz >= 0) & (hertz <= self.rate / 2))]
        if outside.size:
            raise FilterError(
                f"a response at {outside.flat[0]} Hz was asked for; "
                f"allowed are 0 to {self.rate / 2:g} Hz, half the rate."
            )
        points = response.circle(hertz.reshape(-1), self.rate)
        total = np.ones(points.hertz.shape, np.complex128)
        with np.errstate(divide="ignore", invalid="ignore"):
            for factor in self.factors:
                total *= _response_of(factor, points)
        return total.reshape(hertz.shape)

    def unstable_poles(self) -> int:
        """How many poles lie on or outside the unit circle. Whether there are any is decided exactly."""
        return sum(stability.unstable_poles(factor) for factor in self.factors)


def _normalized(numerator: Polynomial, denominator: Polynomial) -> Polynomials:
    inverse = 1 / denominator[0]
    return Polynomials(rounded(scaled(numerator, inverse)), rounded(scaled(denominator, inverse)))


def _joined(codes: list[Codes | None]) -> Codes | None:
    given = [table for table in codes if table is not None]
    if not given:
        return None
    words = sorted({table.word for table in given})
    if len(given) < len(codes) or len(words) > 1:
        raise FilterError(
            f"a cascade joins a filter given as codes ({', '.join(words)}) with one that is given otherwise; "
            "codes stand only beside codes of the same word. Give all as codes, or all as numbers."
        )
    return Codes(tuple(row for table in given for row in table.rows), words[0])


def _degrees(factor: Factor) -> tuple[int, int]:
    if isinstance(factor, ZerosPoles):
        return len(factor.zeros) + factor.delay, len(factor.poles)
    return len(stripped(exactly(factor.b))) - 1, len(stripped(exactly(factor.a))) - 1


def _expanded(factor: Factor) -> tuple[Polynomial, Polynomial]:
    """Exact polynomials in ascending powers of z^-1."""
    if isinstance(factor, Polynomials):
        return exactly(factor.b), exactly(factor.a)
    delayed = (Fraction(0),) * factor.delay + from_roots(factor.zeros)
    return scaled(delayed, Fraction(factor.gain)), from_roots(factor.poles)


def _solved(factor: Factor) -> ZerosPoles:
    if isinstance(factor, ZerosPoles):
        return factor
    b, a = factor.b[: _degrees(factor)[0] + 1], factor.a[: _degrees(factor)[1] + 1]
    if b == (0.0,):
        return ZerosPoles((), roots(a), 0.0)
    delay = next(i for i, value in enumerate(b) if value != 0)
    return ZerosPoles(roots(b[delay:]), roots(a), b[delay], delay)


def _gathered(groups: Iterable[tuple[complex, ...]]) -> tuple[complex, ...]:
    """Conjugate pairs before real roots, otherwise in their order."""
    everything = [root for group in groups for root in group]
    return tuple([r for r in everything if r.imag != 0] + [r for r in everything if r.imag == 0])


def _response_of(factor: Factor, points: response.Circle) -> npt.NDArray[np.complex128]:
    if isinstance(factor, ZerosPoles):
        return response.of_zeros_poles(factor, points)
    return response.of_polynomials(factor, points)
