"""frequency-sampling: a finite response as a comb and damped resonators, one for each of its frequency samples.

    v[n]  = x[n] - c0 x[n-L],  c0 = r^L
    y0[n] = e0 v[n] - a0 y0[n-1]                                      0 Hz; half the rate alike
    yk[n] = ek v[n] + hk v[n-1] - ak yk[n-1] - rk yk[n-2]             the pair of samples k and L - k
    y[n]  = y0[n] + y1[n] + ...

for L taps b, with the samples taken on the circle of the resonators, so that the damping changes nothing:

    Hk = sum over n of b[n] r^-n e^(-j w n),  w = 2 pi k / L
    ek = 2 Re Hk / L,  hk = -2 r Re(Hk e^(-j w)) / L,  ak = -2 r cos w,  rk = r^2
    e0 = H0 / L,  a0 = -r;  at half the rate +r

drawn with the resonator of 0 Hz and that of the first pair; the others stand below and join the sum alike:

    x --+------>(+)--- v ---+---+---e0---->(+)-----+-----------> (+)
        |      - ^          |   |           ^      |              |
        +-z^-L--c0          |   |           +-- r -+-z^-1         |
                            |   |                                 v
                            |   +---e1---->(+)-----+------------>(+)---> y
                            |               ^      |
                            |             z^-1     |
                            |               |      |
                            +-z^-1--h1---->(+)<-a1-+
                                            ^      |
                                          z^-1     |
                                            |      |
                                           (+)<-r2-+

Each resonator adds from its last delay up, -rk yk2 + hk v1 - ak yk1 + ek v, all outputs by rising frequency. v is a
register one bit longer than the signal, since it can be twice as large as x.

The radius is r = 1 - 2^-k, k = 2 + ceil(log2 L): as far inside the unit circle as leaves the last taps 3/4 of their
weight. Only samples that are not 0 (more than 2^-50 of the taps' sum) get a resonator.

Source: Oppenheim & Schafer, Discrete-Time Signal Processing, ch. 6, frequency-sampling structures; L. Rabiner and R.
Schafer, Recursive and nonrecursive realizations of digital filters designed by frequency sampling techniques, IEEE
Transactions on Audio and Electroacoustics 19 (1971).

Counts: for L taps and all samples, L even: L/2 - 1 resonators of second order, each 4 multiplications and 3 additions,
two of first, each 2 and 1, the comb, and the sum: 2L + 1 multiplications, 2L additions, 2L + 1 words of memory. In
fixed point one rounding for each resonator, and one for v.

Recursive, with a finite response: each pole is cancelled by a zero of the comb, as far as rounded coefficients let it.

Good at: filters that are thought of sample by sample: each sample of the frequency response has a resonator and
coefficients of its own, and can be changed alone. In floating point it is as exact as the taps.

Fails: the saving that made the structure known, no resonator where the response is 0, needs poles on the unit circle
itself, which nothing then cancels exactly. With the damping that makes it safe a sample that is 0 on the unit circle is
not 0 on the circle of r. The rounding of each resonator passes through its narrow pole. Rounded coefficients leave an
echo that dies out within some 4 L frames.

Arithmetic: long words for state and coefficients (32x32+64), or floating point. With 16-bit coefficients the numerators,
of the size 1/L, lose bits: point = "polynomial" keeps them apart from the poles.

Carries: a finite response of 4 to 128 taps, whole: fewer, as in sections of a cascade, are more easily had.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from functools import lru_cache
from typing import Any

from streamhost.diagram.builder import Builder, Ref, Signed, minus
from streamhost.diagram.hints import General
from streamhost.diagram.tapped import LEAD
from streamhost.filters import Polynomials
from streamhost.filters.exact import Polynomial, exactly, to_mpf
from streamhost.structures.division import Ratio
from streamhost.structures.form import Draft, Form, Size
from streamhost.structures.taps import refused_recursion

LEAST_TAPS, MOST_TAPS = 4, 128
BITS = 256
NEGLIGIBLE = Fraction(1, 1 << 50)

BUS = 2.25
MOST_ROWS = 16.25
"""Rows that a page holds."""

FIRST, SECOND = 1.75, 3.0
"""Rows of a resonator of first and of second order."""


HAZARD = (
    "the finite response comes from poles that zeros cancel: with rounded coefficients they do so only nearly, and an echo "
    "is left that dies out as the poles do."
)


@dataclass(frozen=True)
class Resonator:
    """Sample `k`: the numerator's b0 and b1, the denominator's a1 and a2; of first order one of each."""

    k: int
    b: tuple[float, ...]
    a: tuple[float, ...]

    @property
    def inner(self) -> bool:
        """Whether it is of second order: of a pair of samples, neither at 0 Hz nor at half the rate."""
        return len(self.b) == 2

    @property
    def rows(self) -> float:
        return SECOND if self.inner else FIRST


def radius(length: int) -> Fraction:
    """1 - 2^-k with k = 2 + ceil(log2 length)."""
    return 1 - Fraction(1, 4 << (length - 1).bit_length())


@lru_cache(maxsize=64)
def resonators(taps: Polynomial) -> tuple[Resonator, ...]:
    """Those of the samples that are not 0, by rising frequency, each coefficient rounded once."""
    import mpmath

    length, found = len(taps), []
    r = radius(length)
    with mpmath.workprec(BITS):
        raised = [to_mpf(tap / r**n) for n, tap in enumerate(taps)]
        least = sum(map(abs, raised)) * to_mpf(NEGLIGIBLE)
        for k in range(length // 2 + 1):
            turn = mpmath.expjpi(-mpmath.mpf(2 * k) / length)
            sample = mpmath.polyval(raised, turn, asc=True)
            if abs(sample) > least:
                found.append(_resonator(k, length, sample, turn, to_mpf(r)))
    return tuple(found)


def _resonator(k: int, length: int, sample: Any, turn: Any, r: Any) -> Resonator:
    import mpmath

    if 2 * k in (0, length):
        return Resonator(k, (float(sample.real / length),), (float(-r * turn.real),))
    b = (2 * sample.real / length, -2 * r * mpmath.re(sample * turn) / length)
    return Resonator(k, tuple(map(float, b)), (float(-2 * r * turn.real), float(r * r)))


def carries(ratio: Ratio) -> str:
    if refused := refused_recursion(ratio):
        return refused
    if not any(ratio.b):
        return "its numerator is 0"
    if not LEAST_TAPS <= len(ratio.b) <= MOST_TAPS:
        return f"it has {len(ratio.b)} tap{'s' * (len(ratio.b) > 1)}, and {LEAST_TAPS} to {MOST_TAPS} can be drawn"
    return ""


def hazards(ratio: Ratio) -> tuple[str, ...]:
    return (HAZARD,)


def build_section(draft: Draft, x: Ref) -> Ref:
    taps = draft.ratio.b
    return bank(draft, x, len(taps), [(each, str(each.k)) for each in resonators(taps)])


def bank(draft: Draft, x: Ref, length: int, found: Sequence[tuple[Resonator, str]]) -> Ref:
    """The comb, the resonators, each with the number that its names end with, and their sum."""
    old = draft.delay("xd", x, at=(0.625, 1.0), n=length)
    inner = any(each.inner for each, _ in found)
    v1 = draft.delay("v1", at=(BUS + 0.5, 1.0), face="S") if inner else None
    comb = draft.gain("c0", float(radius(length) ** length), old, at=(1.25, 1.0))
    v = draft.chain("v", [x, minus(comb)], at=[(1.625, 0.0)], grow=1)
    if v1 is not None:
        v1.takes(v)
    row, outputs, rows = 0.0, [], []
    for each, number in found:
        outputs.append(_resonate(draft, each, number, (v, v1), row))
        rows.append(row)
        row += each.rows
    draft.trunk(v, (BUS, 0.0), (BUS, rows[-1]))
    if v1 is not None:
        lowest = max(at for at, (each, _) in zip(rows, found, strict=True) if each.inner)
        draft.trunk(v1, (BUS + 0.5, 1.625), (BUS + 0.5, lowest + 1))
    return draft.chain("y", outputs, at=[(BUS + 5.25, at) for at in rows[1:]], face="S", last="E")


def _resonate(draft: Draft, each: Resonator, k: str, source: tuple[Ref, Ref | None], row: float) -> Ref:
    """One resonator on v and v1, drawn as direct-1 is."""
    left, (v, v1) = BUS + 1, source
    past: list[Ref] = []
    for i in range(1, len(each.a) + 1):
        at = (left + 3.25, row + i - 0.5)
        past.append(draft.delay(f"y{k}d{i}", past[-1] if past else None, at=at, face="S"))
    terms: list[Ref | Signed] = []
    rows: list[float] = []
    for i in reversed(range(len(each.a) + 1)):
        if 1 <= i < len(each.b):
            assert v1 is not None, "resonators of second order read v1"
            terms.append(draft.gain(f"h{k}", each.b[i], v1, at=(left + 0.5, row + i), part="b"))
        if i >= 1:
            at, name = (left + 2.375, row + i), f"a{k}" if i == 1 else f"r{k}"
            terms.append(minus(draft.gain(name, each.a[i - 1], past[i - 1], at=at, face="W", part="a", feedback=True)))
        if i == 0:
            terms.append(draft.gain(f"e{k}", each.b[0], v, at=(left + 0.5, row), part="b"))
        rows += [row + i] * (len(terms) - len(rows))
    y = draft.climb(f"y{k}", terms, column=left + 1.5, rows=rows)
    past[0].takes(y)
    return y


def size(ratio: Ratio) -> Size:
    rows = [each.rows for each in resonators(ratio.b)]
    last = sum(rows[:-1])
    return Size(_width(len(rows)), last + rows[-1], last)


def _width(resonators: int) -> float:
    return BUS + (5.25 if resonators > 1 else 4.5)


def general(section: Polynomials) -> General | None:
    """A resonator k that stands for all of second order, where there are more than a page holds."""
    found = resonators(exactly(section.b))
    inner = [each for each in found if each.inner]
    if sum(each.rows for each in found) <= MOST_ROWS or len(inner) < 2:
        return None
    builder = Builder()
    draft = Draft(builder, section, origin=(LEAD, 0.0))
    drawn = [(each, "_k" if each.inner else str(each.k)) for each in found if not each.inner or each is inner[0]]
    y = bank(draft, builder.place(builder.input(), (0.0, 0.0)), len(section.b), drawn)
    last = sum(each.rows for each, _ in drawn[:-1])
    builder.place(builder.output(y), (LEAD + _width(len(drawn)) + LEAD, last))
    return General(builder.build(), f"The resonator of k stands for the {len(inner)} of second order, from k = {inner[0].k} to "
                                    f"{inner[-1].k}; all outputs are added.")


FORM = Form(
    name="frequency-sampling",
    summary="a finite response as a comb and a damped resonator for each frequency sample",
    begins_with="numerator",
    build_section=build_section,
    docs=__doc__,
    carries=carries,
    hazards=hazards,
    exact_size=size,
    general=general,
)
