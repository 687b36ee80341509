"""fir-lattice: a finite response as a chain of two-multiplier lattice stages.

    f0[n] = g0[n] = b0 x[n]
    fm[n] = f(m-1)[n] + km g(m-1)[n-1],   m = 1 ... M
    gm[n] = km f(m-1)[n] + g(m-1)[n-1]
    y[n]  = fM[n]                         gM is not needed, and not made

drawn for three taps:

    x ---b0---+---------+-------->(+)------------+---------->(+)---> y
              |         |          ^             |            ^
              |         +---k1--+  |             |            |
              |                 |  |             |            |
              |         +---k1--|--+             |            |
              |         |       v                |            |
              +--z^-1---+----->(+)------z^-1-----+-----k2-----+

The km come from the taps by the step-down recursion, in exact numbers: with A of order m, A = B / b0 for m = M,

    km = a(m),   a(m-1)(i) = (a(i) - km a(m - i)) / (1 - km^2)

Sums are added as they are written; stage by stage, f before g.

Source: Oppenheim & Schafer, Discrete-Time Signal Processing, ch. 6, lattice structures for FIR systems; J. Makhoul, A
class of all-zero lattice digital filters, IEEE Transactions on Acoustics, Speech, and Signal Processing 26 (1978).

Counts: 2M multiplications for M + 1 taps, 2M - 1 additions, M words of memory. In
fixed point 2M - 1 roundings for M > 1: the f before the last is read by a sum alone, and stays in its accumulator.

Good at: prediction error filters, which this structure comes from: all orders up to M are there at once, and all |km| < 1
says that all zeros are inside the unit circle (A is of minimum phase).

Fails: twice the multiplications of direct-1, a rounding at each sum. Where a |km| is larger than 1, as in filters that
are not of minimum phase, inner signals are larger than input and output; where one is near 1, as of a filter that is
nearly symmetric, they are larger by any amount.

Arithmetic: floating point, or words with integer bits for what the stages add.

Carries: a finite response of up to 64 taps whose |km| are none exactly 1. Symmetric and antisymmetric taps have
|kM| = 1 and are refused (folded draws them). Zeros before the first tap are a delay. Draw it whole.
"""

from functools import lru_cache

from streamhost.diagram.builder import Builder, Ref
from streamhost.diagram.hints import General
from streamhost.diagram.tapped import LEAD
from streamhost.filters import Polynomials
from streamhost.filters.exact import Polynomial, exactly
from streamhost.structures.division import Ratio
from streamhost.structures.form import Draft, Form, Size
from streamhost.structures.taps import lead_of, refused_recursion

MOST_TAPS = 64
NEAR = 1e-3

CELL = 2.5
A_ROW = 3
"""Stages drawn side by side."""

MOST_DRAWN = 12
"""Stages that a page holds."""

HEIGHT = 3.75
FRONT = 0.75
LOW = 2.0
"""The row of the lower wire."""


@lru_cache(maxsize=64)
def reflections(taps: Polynomial) -> tuple[Polynomial, int]:
    """k1 ... kM by the step-down recursion, and the stage at which |k| = 1 ends it; 0 where none does."""
    a = [value / taps[0] for value in taps]
    found = []
    for m in range(len(a) - 1, 0, -1):
        k = a[m]
        found.append(k)
        if abs(k) == 1:
            return tuple(reversed(found)), m
        a = [(a[i] - k * a[m - i]) / (1 - k * k) for i in range(m)]
    return tuple(reversed(found)), 0


def carries(ratio: Ratio) -> str:
    if refused := refused_recursion(ratio):
        return refused
    if not any(ratio.b):
        return "its numerator is 0"
    taps = ratio.b[lead_of(ratio.b) :]
    if len(taps) > MOST_TAPS:
        return f"it has {len(taps)} taps, and up to {MOST_TAPS} are drawn"
    last = reflections(taps)[1]
    if last == 0:
        return ""
    if last == len(taps) - 1:
        return "its first and last taps are equally large, so that k of the last stage is 1 or -1 and the step-down ends there"
    return f"k of stage {last} is 1 or -1, where the step-down ends"


def hazards(ratio: Ratio) -> tuple[str, ...]:
    nearest = min((abs(1 - abs(k)) for k in reflections(ratio.b[lead_of(ratio.b) :])[0]), default=1)
    if nearest > NEAR:
        return ()
    sentence = (
        f"a lattice stage has a |k| within {float(nearest):.1e} of 1: signals before it are larger than its output by far, "
        "and rounding with them."
    )
    return (sentence,)


def build_section(draft: Draft, x: Ref) -> Ref:
    b = draft.ratio.b
    lead = lead_of(b)
    if lead:
        x = draft.delay("lead", x, at=(0.0, 0.0), n=lead)
    ks = reflections(b[lead:])[0]
    f = g = draft.gain("b0", float(b[lead]), x, at=(FRONT, 0.0), part="b")
    delays = [draft.delay(f"g{m}d", at=(place(m)[0] + 0.5, place(m)[1] + LOW)) for m in range(len(ks))]
    for m, k in enumerate(ks, 1):
        delays[m - 1].takes(g)
        f, g = stage(draft, m, str(m), float(k), (f, delays[m - 1]), last=m == len(ks))
        if m < len(ks) and m % A_ROW == 0:
            wrap(draft, f, g, m)
    return f


def place(m: int) -> tuple[float, float]:
    """The first column and row of the stage after m others."""
    row, cell = divmod(m, A_ROW)
    return FRONT + 0.5 + cell * CELL, row * HEIGHT


def stage(draft: Draft, m: int, name: str, k: float, from_left: tuple[Ref, Ref], *, last: bool) -> tuple[Ref, Ref]:
    """f and g of the m-th stage drawn, from f and the delayed g of the one before; of the last stage only f."""
    f, past = from_left
    column, row = place(m - 1)
    if last:
        product = draft.gain(f"k{name}", k, past, at=(column + 1.125, row + LOW))
        return draft.add(f"f{name}", [f, product], at=(column + 1.75, row)), past
    up = draft.gain(f"k{name}", k, past, at=(column + 1.25, row + 0.75))
    down = draft.again(up, f"k{name}", f, at=(column + 1.25, row + 1.375))
    f = draft.add(f"f{name}", [f, up], at=(column + 1.875, row))
    return f, draft.add(f"g{name}", [down, past], at=(column + 1.875, row + LOW))


def wrap(draft: Draft, f: Ref, g: Ref, m: int) -> None:
    """The two wires from the end of a row to the beginning of the next, one inside the other."""
    right, row = place(m - 1)[0] + CELL, place(m - 1)[1]
    left, below = place(m)
    for ref, low, out, back, gutter in ((f, 0.0, 0.5, -0.25, 3.25), (g, LOW, 0.0, -0.75, 2.75)):
        here, there = right + out, left + back
        draft.trunk(ref, (here, row + low), (here, row + gutter), (there, row + gutter), (there, below + low))


def size(ratio: Ratio) -> Size:
    stages = len(ratio.b) - lead_of(ratio.b) - 1
    if stages == 0:
        return Size(2 * FRONT, 0.0)
    last, row = place(stages - 1)
    wide = place(A_ROW - 1)[0] + CELL if stages > A_ROW else 0.0
    return Size(max(last + 1.75, wide), row + LOW, row)


def general(section: Polynomials) -> General | None:
    """A stage m that stands for all but the last, where there are more than a page holds."""
    stages = len(section.b) - lead_of(exactly(section.b)) - 1
    if stages <= MOST_DRAWN:
        return None
    builder = Builder()
    draft = Draft(builder, section, origin=(LEAD, 0.0))
    x = builder.place(builder.input(), (0.0, 0.0))
    f = g = draft.gain("b0", 1.0, x, at=(FRONT, 0.0), part="b")
    for m, name in enumerate(("_m", "_M")):
        past = draft.delay(f"g{m}d", g, at=(place(m)[0] + 0.5, LOW))
        f, g = stage(draft, m + 1, name, 0.5, (f, past), last=m == 1)
    builder.place(builder.output(f), (LEAD + place(1)[0] + 1.75 + LEAD, 0.0))
    return General(builder.build(), f"The stage of m stands for all stages m = 1 to {stages - 1}, one behind the other; "
                                    f"M = {stages}.")


FORM = Form(
    name="fir-lattice",
    summary="a finite response in lattice stages of two multipliers, as linear prediction makes them",
    begins_with="numerator",
    build_section=build_section,
    docs=__doc__,
    carries=carries,
    hazards=hazards,
    exact_size=size,
    general=general,
)
