"""The two smallest filters of the trade: the moving average and the DC blocker."""

from fractions import Fraction
from math import pi, tan

from streamhost.errors import FilterError
from streamhost.filters.filter import Filter
from streamhost.filters.kind import Kind
from streamhost.filters.parameters import Count, Frequency, Inside, Parameter


def moving_average(rate: float, *, length: int) -> Filter:
    """The mean of the last `length` samples: gain 1 at 0 Hz, nulls at the multiples of rate / length."""
    return Filter.from_coefficients([Fraction(1, length)] * length, rate=rate)


def dc_blocker(rate: float, *, frequency: float | None = None, pole: float | None = None) -> Filter:
    """(1 - z^-1) / (1 - p z^-1): no multiplication but the pole's. The gain at half the rate is 2 / (1 + p).

    `frequency` is where it is 3.01 dB below its gain at half the rate; the pole is then that of the first-order
    Butterworth high-pass, (1 - t) / (1 + t) with t = tan(pi frequency / rate).
    """
    if pole is None:
        assert frequency is not None
        t = tan(pi * frequency / rate)
        pole = (1 - t) / (1 + t)
    if abs(pole) >= 1:
        raise FilterError("the pole rounds to the unit circle: the frequency is too near to 0 Hz or to half the rate.")
    return Filter.from_coefficients([1, -1], [1, -pole], rate=rate)


# The longest that anything here is made for; a second at 48 kHz is better made in two stages.
LENGTH = Parameter("length", "samples", "how many samples are averaged", Count(1, 4096))
FREQUENCY = Parameter("frequency", "Hz", "3.01 dB below the gain at half the rate", Frequency())
POLE = Parameter("pole", "", "the pole on the real axis", Inside(0.0, 1.0))

KINDS = (
    Kind(
        "moving-average",
        "the mean of the last samples",
        "Oppenheim & Schafer, moving-average systems",
        (LENGTH,),
        moving_average,
    ),
    Kind(
        "dc-blocker",
        "takes 0 Hz out by a zero there and a pole near it; gain 2 / (1 + pole) at half the rate",
        "common practice",
        (FREQUENCY, POLE),
        dc_blocker,
        alternatives=("frequency", "pole"),
    ),
)
