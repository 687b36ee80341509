"""What is wanted: a transfer function with a sample rate. It knows nothing of structure or arithmetic."""

import re
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace
from fractions import Fraction

import numpy as np
import numpy.typing as npt

from streamhost.errors import FilterError
from streamhost.filters import entry, response, stability
from streamhost.filters.equation import coefficients
from streamhost.filters.exact import ONE, Polynomial, product, rounded, stripped
from streamhost.filters.factor_algebra import (
    Factor,
    degrees,
    expanded,
    gathered,
    joined_codes,
    normalized,
    response_of,
    solved,
)
from streamhost.filters.factors import Codes, Polynomials, ZerosPoles

ONLY = "y"
"""The name of a filter's output where there is one."""

OUTPUT_NAME = re.compile("[a-z][a-z0-9]*")
MOST_OUTPUTS = 8


@dataclass(frozen=True)
class Filter:
    """A transfer function H(z), the product of its factors, at a sample rate in hertz; or several, one for each output.

    Factors are kept as they were given, so that nothing is lost before a structure needs another description.
    `sections_given`: every factor is a section of first or second order, in the order that was asked for.
    `codes`: the integers that the sections were given as, if they were.
    `branches`: of several outputs, what stands between the factors, which they have in common, and each of them.
    Made by the class methods, which check what they are given; all of them raise FilterError.
    """

    rate: float
    factors: tuple[Factor, ...]
    sections_given: bool
    codes: Codes | None = None
    branches: tuple["Branch", ...] = ()

    @classmethod
    def from_coefficients(cls, b: object, a: object = (1.0,), *, rate: object) -> "Filter":
        """B(z) / A(z) from lists in ascending powers of z^-1; a[0] is divided out, each quotient rounded once."""
        numerator, denominator = entry.numbers(b, "b"), entry.numbers(a, "a")
        if denominator[0] == 0:
            raise FilterError(f"a[0] is 0; the first of the {len(denominator)} numbers in a must not be 0.")
        factor = normalized(stripped(numerator), stripped(denominator))
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
        factors = tuple(normalized(tuple(row[:3]), tuple(row[3:])) for row in rows)
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
            factors.append(normalized(tuple(values[:3]), tuple(values[3:])))
        return cls(entry.rate(rate), tuple(factors), sections_given=True, codes=Codes(rows, word))

    @classmethod
    def cascade(cls, filters: Iterable["Filter"]) -> "Filter":
        """The product of filters at one rate, in their order. Only the last may have several outputs.

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
        if split := next((part for part in parts[:-1] if part.branches), None):
            raise FilterError(
                f"a filter with the outputs {', '.join(split.outputs)} stands before the end of a cascade; nothing may "
                "follow a filter with several outputs. Put it last."
            )
        return cls(
            rates[0],
            tuple(factor for part in parts for factor in part.factors),
            all(part.sections_given for part in parts),
            joined_codes([part.codes for part in parts]),
            parts[-1].branches,
        )

    @classmethod
    def split(cls, outputs: Mapping[str, "Filter"]) -> "Filter":
        """A filter with several outputs: each by name, with the filter that leads to it. Their input is one.

        Names are small letters and digits. What all have in common is put in front by `cascade`. Filters given as codes,
        and filters with several outputs themselves, are refused.
        """
        check_outputs(outputs)
        rates = sorted({filter.rate for filter in outputs.values()})
        if len(rates) > 1:
            raise FilterError(f"the outputs have the rates {', '.join(f'{r:g}' for r in rates)} Hz; all must have one.")
        branches = tuple(Branch(name, filter) for name, filter in outputs.items())
        return cls(rates[0], (), sections_given=True, branches=branches)

    @property
    def outputs(self) -> tuple[str, ...]:
        """The names of the outputs; of one it is y."""
        return tuple(branch.name for branch in self.branches) or (ONLY,)

    def output(self, name: str) -> "Filter":
        """The filter from the input to one output."""
        if name not in self.outputs:
            raise FilterError(f"there is no output {name!r}; outputs are {', '.join(self.outputs)}.")
        own = next((branch.filter for branch in self.branches if branch.name == name), self)
        return own if own is self or not self.factors else Filter.cascade([self.common, own])

    @property
    def common(self) -> "Filter":
        """What all outputs have in common, with one output: the whole filter where it has one itself."""
        return replace(self, branches=())

    @property
    def order(self) -> int:
        """The higher of the degrees of B and A in z^-1: the delays that a canonic form needs. The highest of all outputs."""
        found = [degrees(factor) for factor in self.factors]
        own = max(sum(b for b, _ in found), sum(a for _, a in found))
        return max(self.output(name).order for name in self.outputs) if self.branches else own

    @property
    def is_recursive(self) -> bool:
        """Whether any denominator has a coefficient beyond a0."""
        own = any(a > 0 for _, a in map(degrees, self.factors))
        return own or any(branch.filter.is_recursive for branch in self.branches)

    def sections(self) -> tuple[Polynomials, ...]:
        """The sections as they were given; FilterError where the filter was not given as sections."""
        self._check_one_output("its sections")
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
        self._check_one_output("the product of its factors")
        numerator, denominator = ONE, ONE
        for factor in self.factors:
            b, a = expanded(factor)
            numerator, denominator = product(numerator, b), product(denominator, a)
        return stripped(numerator), stripped(denominator)

    def zeros_poles(self) -> ZerosPoles:
        """Zeros, poles and gain of the product of all factors; what cancels is kept.

        Each factor given as polynomials is solved on its own, its roots accurate to about one rounding. Orders
        above some 30 take seconds.
        """
        self._check_one_output("its zeros and poles")
        parts = [solved(factor) for factor in self.factors]
        gain = Fraction(1)
        for part in parts:
            gain *= Fraction(part.gain)
        if gain == 0:
            return ZerosPoles((), gathered(part.poles for part in parts), 0.0)
        return ZerosPoles(
            gathered(part.zeros for part in parts),
            gathered(part.poles for part in parts),
            rounded((gain,))[0],
            sum(part.delay for part in parts),
        )

    def response(self, frequencies_hz: npt.ArrayLike) -> npt.NDArray[np.complex128]:
        """H at frequencies from 0 to rate / 2 in Hz, in the shape of the frequencies; of several outputs, theirs in front.

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
                total *= response_of(factor, points)
        common = total.reshape(hertz.shape)
        return np.stack([common * branch.filter.response(hertz) for branch in self.branches]) if self.branches else common

    def unstable_poles(self) -> int:
        """How many poles lie on or outside the unit circle, of all outputs. Whether there are any is decided exactly."""
        own = sum(stability.unstable_poles(factor) for factor in self.factors)
        return own + sum(branch.filter.unstable_poles() for branch in self.branches)

    def cancelled_poles(self) -> int:
        """How many of those are cancelled exactly by zeros of the polynomials, or zeros and poles, that they are given with."""
        own = sum(stability.cancelled_poles(factor) for factor in self.factors)
        return own + sum(branch.filter.cancelled_poles() for branch in self.branches)

    def _check_one_output(self, what: str) -> None:
        if self.branches:
            raise FilterError(
                f"this filter has the outputs {', '.join(self.outputs)}, and {what} are those of one: choose it by "
                f'output("{self.outputs[0]}").'
            )


@dataclass(frozen=True)
class Branch:
    """One of several outputs: its name, and the filter between what all have in common and it."""

    name: str
    filter: Filter


def check_outputs(outputs: Mapping[str, Filter]) -> None:
    """FilterError unless these can be the outputs of one filter."""
    if not 2 <= len(outputs) <= MOST_OUTPUTS:
        raise FilterError(f"{len(outputs)} outputs are named; a filter with several has 2 to {MOST_OUTPUTS}.")
    for name, filter in outputs.items():
        if not isinstance(name, str) or not OUTPUT_NAME.fullmatch(name):
            raise FilterError(f"an output is named {name!r}; a name is a small letter and more of them or digits.")
        if filter.branches:
            raise FilterError(f'the output "{name}" has outputs itself, {", ".join(filter.outputs)}: name them all at once.')
        if filter.codes is not None:
            raise FilterError(f'the output "{name}" is given as codes, and filters with several outputs are not.')
