"""Crossovers: filters with an output for each band.

Low-pass and high-pass are Butterworth halves of one set of poles, made by the bilinear transform with the frequency
prewarped; the low-pass is 1 at 0 Hz and the high-pass at half the rate, each to the last bit of its gain. With B of the
order n, the halves are 1 / B(s) and s^n / B(s), and B(s) B(-s) = 1 + (-1)^n s^(2n). The high output is inverted where the
two would else cancel at the crossover, which is where the order divided by 2 is odd.
"""

from dataclasses import replace

from streamhost.errors import FilterError
from streamhost.filters.classic import cleaned
from streamhost.filters.exact import from_roots, rounded, value
from streamhost.filters.factors import ZerosPoles
from streamhost.filters.filter import Filter
from streamhost.filters.fir import BETA, TAPS, WINDOW, windowed
from streamhost.filters.kind import Kind, Values
from streamhost.filters.parameters import Choice, Count, Frequency, Pair, Parameter


def linkwitz_riley(rate: float, *, order: float, frequency: float) -> Filter:
    """Two Butterworth halves in cascade each: both outputs at -6.02 dB and in phase at the crossover, their sum all-pass.

    Both have one phase at all frequencies. The high output is inverted where the order is 2 or 6.
    """
    low, high = _halves(rate, round(order) // 2, frequency)
    return _split(rate, round(order), low=(low, low), high=(high, high))


def butterworth(rate: float, *, order: int, frequency: float) -> Filter:
    """One Butterworth half each: both outputs at -3.01 dB at the crossover, their powers add up to 1.

    The sum is all-pass where the order is odd; where it is even it is 3.01 dB too high at the crossover. The high output
    is inverted where the order is 2, 6, 10 or 14.
    """
    low, high = _halves(rate, order, frequency)
    return _split(rate, order, low=(low,), high=(high,))


def linkwitz_riley_3(rate: float, *, frequency: tuple[float, float]) -> Filter:
    """Three ways of order 4: the upper band is split once more, and the low output takes the all-pass of that split.

    So all three are in phase with each other around their crossovers, and their sum is the all-pass of both splits.
    """
    low, rest = _halves(rate, 2, frequency[0])
    middle, high = _halves(rate, 2, frequency[1])
    turned = _all_pass(middle)
    branches = {"low": (low, low, turned), "mid": (rest, rest, middle, middle), "high": (rest, rest, high, high)}
    return Filter.split({name: _product(rate, *factors) for name, factors in branches.items()})


def complementary(
    rate: float, *, taps: int, frequency: float, window: str | None = None, beta: float | None = None
) -> Filter:
    """A linear-phase low-pass, and the impulse delayed as much without it: the sum is a delay and nothing else.

    Both are at about -6 dB at the crossover.
    """
    given = {name: chosen for name, chosen in (("window", window), ("beta", beta)) if chosen is not None}
    low = windowed(rate, response="low-pass", taps=taps, frequency=frequency, **given)  # type: ignore[arg-type]
    kept, _ = low.whole()
    rest = [-tap for tap in kept]
    rest[len(kept) // 2] += 1.0
    return Filter.split({"low": low, "high": Filter.from_coefficients(rest, rate=rate)})


def _halves(rate: float, order: int, frequency: float) -> tuple[ZerosPoles, ZerosPoles]:
    """Butterworth low-pass and high-pass of the same poles to the bit."""
    from scipy import signal

    found = signal.butter(order, frequency, "lowpass", output="zpk", fs=rate)[1]
    made = Filter.from_zeros_poles([-1.0] * order, list(map(cleaned, found.tolist())), 1.0, rate=rate).factors[0]
    assert isinstance(made, ZerosPoles), "made of zeros and poles"
    denominator = from_roots(made.poles)
    at_zero, at_half = (float(value(denominator, point)) / 2**order for point in (denominator[0], -denominator[0]))
    if not at_zero > 0 or not at_half > 0:
        raise FilterError("the poles round to the unit circle: the frequency is too near to 0 Hz or to half the rate")
    return replace(made, gain=at_zero), replace(made, zeros=(1 + 0j,) * order, gain=at_half)


def _split(rate: float, order: int, *, low: tuple[ZerosPoles, ...], high: tuple[ZerosPoles, ...]) -> Filter:
    if order % 4 == 2:
        high = (replace(high[0], gain=-high[0].gain), *high[1:])
    return Filter.split({"low": _product(rate, *low), "high": _product(rate, *high)})


def _product(rate: float, *factors: ZerosPoles) -> Filter:
    return Filter(rate, factors, sections_given=False)


def _all_pass(half: ZerosPoles) -> ZerosPoles:
    """The sum of low-pass and high-pass of order 4: the poles of the half, and zeros where they are mirrored."""
    gain = rounded(from_roots(half.poles))[-1]
    return ZerosPoles(tuple(1 / pole.conjugate() for pole in half.poles), half.poles, gain)


def _taps_conflicts(values: Values) -> list[str]:
    return [] if values["taps"] % 2 else [f"taps is {values['taps']}; only an odd number has one in the middle"]


LINKWITZ_RILEY_SOURCE = "S. Linkwitz, Active crossover networks for noncoincident drivers, J. Audio Eng. Soc. 24 (1976)"
BUTTERWORTH_SOURCE = "Butterworth low-pass and high-pass of one frequency; common practice"
COMPLEMENTARY_SOURCE = "delay-complementary pair of linear phase; Mitra, complementary transfer functions"

CROSSOVER = Parameter("frequency", "Hz", "where low and high are equal", Frequency())
CROSSOVERS = Parameter("frequency", "Hz", "the two crossovers, from low to mid and from mid to high", Pair())
ORDER = Parameter("order", "", "order of each output; 6 dB an octave each", Choice((2, 4, 6, 8)))
HALF_ORDER = Parameter("order", "", ORDER.meaning, Count(1, 16))

KINDS = (
    Kind(
        "linkwitz-riley",
        "low and high, -6.02 dB and in phase at the crossover, their sum all-pass; high is inverted in orders 2 and 6",
        LINKWITZ_RILEY_SOURCE,
        (ORDER, CROSSOVER),
        linkwitz_riley,
    ),
    Kind(
        "linkwitz-riley-3",
        "low, mid and high of order 4, low with the all-pass of the upper crossover, so that their sum is all-pass",
        LINKWITZ_RILEY_SOURCE,
        (CROSSOVERS,),
        linkwitz_riley_3,
    ),
    Kind(
        "butterworth-crossover",
        "low and high, -3.01 dB at the crossover; odd orders: the sum is all-pass, even ones: 3.01 dB too high there",
        BUTTERWORTH_SOURCE,
        (HALF_ORDER, CROSSOVER),
        butterworth,
    ),
    Kind(
        "complementary",
        "a linear-phase low by a window, and high, what it leaves of the delayed input: their sum is a delay",
        COMPLEMENTARY_SOURCE,
        (TAPS, CROSSOVER, WINDOW, BETA),
        complementary,
        alternatives=("window", "beta"),
        conflicts=_taps_conflicts,
    ),
)
