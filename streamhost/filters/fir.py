"""Linear-phase filters: symmetric taps, symmetric to the last bit, so that a structure may fold them.

The delay is half of one less than the number of taps. Even numbers of taps force a zero at half the rate, so that what
passes there needs an odd number.
"""

import numpy as np
import numpy.typing as npt

from streamhost.errors import FilterError
from streamhost.filters.filter import Filter
from streamhost.filters.kind import Kind, Values
from streamhost.filters.parameters import Above, Between, Count, Edges, Parameter, Word
from streamhost.filters.responses import EDGES, RESPONSE, edge_conflicts

Taps = npt.NDArray[np.float64]
Frequencies = float | tuple[float, float]

WINDOWS = ("rectangular", "hann", "hamming", "blackman")
# What rounding leaves of a tap that is 0, as every second one of a filter at a quarter of the rate.
NOISE = 2.0**-50

MOST_EXCHANGES = 250
# Points for each free tap; with the usual 16 the ripples differ by some percent.
GRID_DENSITY = 64


def windowed(
    rate: float,
    *,
    response: str,
    taps: int,
    frequency: Frequencies,
    window: str | None = None,
    beta: float | None = None,
) -> Filter:
    """The ideal response cut off by a window: about -6 dB at the edges.

    Gain 1 at 0 Hz (low-pass, band-stop), at half the rate (high-pass) or midway between the edges (band-pass). Hann's
    and Blackman's windows are taken without the zeros at their ends, which would be no taps. `beta`: Kaiser's window.
    """
    edges = np.atleast_1d(np.asarray(frequency, np.float64)) * 2 / rate
    shape = np.kaiser(taps, beta) if beta is not None else _window(window or "", taps)
    return _filter(rate, _scaled(_ideal(response, edges, taps) * shape, response, edges))


def least_squares(
    rate: float,
    *,
    response: str,
    taps: int,
    frequency: Frequencies,
    stop_frequency: Frequencies,
    stop_weight: float,
) -> Filter:
    """The least integral of the squared error over pass-band and stop-band; `stop_weight` multiplies the latter's."""
    from scipy import signal

    bands, wanted = _bands(rate, response, frequency, stop_frequency)
    found = signal.firls(taps, bands, np.repeat(wanted, 2), weight=_weights(wanted, stop_weight), fs=rate)
    return _filter(rate, np.asarray(found, np.float64))


def equiripple(
    rate: float,
    *,
    response: str,
    taps: int,
    frequency: Frequencies,
    stop_frequency: Frequencies,
    stop_weight: float,
) -> Filter:
    """The least greatest error (Parks and McClellan): ripple in the stop-band 1 / `stop_weight` of the pass-band's."""
    from scipy import signal

    bands, wanted = _bands(rate, response, frequency, stop_frequency)
    weights = _weights(wanted, stop_weight)
    try:
        found = signal.remez(
            taps, bands, wanted, weight=weights, fs=rate, maxiter=MOST_EXCHANGES, grid_density=GRID_DENSITY
        )
    except ValueError:
        raise FilterError(
            "the exchange algorithm does not converge: the ripple is too small for float64. "
            "Fewer taps, or bands that lie nearer to each other, help."
        ) from None
    return _filter(rate, np.asarray(found, np.float64))


def _window(name: str, taps: int) -> Taps:
    if name == "hann":
        return np.asarray(np.hanning(taps + 2)[1:-1], np.float64)
    if name == "blackman":
        return np.asarray(np.blackman(taps + 2)[1:-1], np.float64)
    return np.asarray(np.hamming(taps) if name == "hamming" else np.ones(taps), np.float64)


def _ideal(response: str, edges: Taps, taps: int) -> Taps:
    """Taps of the ideal response; edges as parts of half the rate."""
    time = np.arange(taps) - (taps - 1) / 2
    low = [edge * np.sinc(edge * time) for edge in edges]
    # The responses that need the impulse have odd numbers of taps: `_parity`.
    impulse = (time == 0).astype(np.float64)
    ideal = {
        "low-pass": low[0],
        "high-pass": impulse - low[0],
        "band-pass": low[-1] - low[0],
        "band-stop": impulse - low[-1] + low[0],
    }
    return np.asarray(ideal[response], np.float64)


def _scaled(taps: Taps, response: str, edges: Taps) -> Taps:
    centre = {"high-pass": 1.0, "band-pass": float(edges.sum()) / 2}.get(response, 0.0)
    time = np.arange(len(taps)) - (len(taps) - 1) / 2
    gain = float(np.sum(taps * np.cos(np.pi * centre * time)))
    if not abs(gain) > NOISE:
        raise FilterError("nothing of the band that should pass is left: there are too few taps for so narrow a band.")
    return taps / gain


def _bands(rate: float, response: str, passed: Frequencies, stopped: Frequencies) -> tuple[list[float], list[float]]:
    """Edges of all bands in rising order from 0 to half the rate, and the wanted gain of each band."""
    edges = sorted(edge for side in (passed, stopped) for edge in (side if isinstance(side, tuple) else (side,)))
    wanted = {
        "low-pass": [1.0, 0.0],
        "high-pass": [0.0, 1.0],
        "band-pass": [0.0, 1.0, 0.0],
        "band-stop": [1.0, 0.0, 1.0],
    }
    return [0.0, *edges, rate / 2], wanted[response]


def _weights(wanted: list[float], stop_weight: float) -> list[float]:
    return [1.0 if gain else stop_weight for gain in wanted]


def _filter(rate: float, taps: Taps) -> Filter:
    """The taps made exactly symmetric; what is rounding only becomes 0, and zeros at both ends are no taps."""
    if not np.all(np.isfinite(taps)):
        raise FilterError("the method finds no finite taps for these edges: they are too near to each other.")
    even = (taps + taps[::-1]) / 2
    even[np.abs(even) < NOISE * np.abs(even).max()] = 0.0
    kept = np.flatnonzero(even)
    return Filter.from_coefficients(even[kept[0] : kept[-1] + 1].tolist(), rate=rate)


def _parity(values: Values) -> list[str]:
    if values["response"] in ("high-pass", "band-stop") and values["taps"] % 2 == 0:
        return [f"taps is {values['taps']}; a {values['response']} passes half the rate, which needs an odd number"]
    return []


def _window_conflicts(values: Values) -> list[str]:
    return edge_conflicts(values) + _parity(values)


def _band_conflicts(values: Values) -> list[str]:
    problems = edge_conflicts(values) + edge_conflicts(values, "stop_frequency")
    return problems or _order_conflicts(values) + _parity(values)


def _order_conflicts(values: Values) -> list[str]:
    passed, stopped = values["frequency"], values["stop_frequency"]
    inside = {
        "low-pass": lambda: passed < stopped,
        "high-pass": lambda: stopped < passed,
        "band-pass": lambda: stopped[0] < passed[0] and passed[1] < stopped[1],
        "band-stop": lambda: passed[0] < stopped[0] and stopped[1] < passed[1],
    }
    if inside[values["response"]]():
        return []
    rule = {
        "low-pass": "above the edge of the pass-band",
        "high-pass": "below the edge of the pass-band",
        "band-pass": "outside the edges of the pass-band",
        "band-stop": "inside the edges of the pass-bands",
    }
    return [f"stop_frequency is {stopped}; of a {values['response']} it lies {rule[values['response']]}, {passed}"]


def _odd_conflicts(values: Values) -> list[str]:
    problems = _band_conflicts(values)
    if not problems and values["taps"] % 2 == 0:
        problems.append(f"taps is {values['taps']}; the least-squares method takes an odd number")
    return problems



WINDOW_SOURCE = "window method; Oppenheim & Schafer, ch. 7"
LEAST_SQUARES_SOURCE = "least squares of the error; Mitra, least mean-square error design of linear-phase filters"
EQUIRIPPLE_SOURCE = "Parks-McClellan algorithm; Oppenheim & Schafer, ch. 7"

TAPS = Parameter("taps", "", "how many taps; the delay is half of one less", Count(3, 4096))
# Both methods solve for all taps at once; of more than this they lose digits or do not converge.
SOLVED_TAPS = Parameter("taps", "", TAPS.meaning, Count(3, 1024))
WINDOW = Parameter("window", "", "the window", Word(WINDOWS))
BETA = Parameter("beta", "", "shape of Kaiser's window, 0 rectangular", Between(0.0, 30.0))
PASS_EDGES = Parameter("frequency", "Hz", "edge of the pass-band, or two for a band", Edges())
STOP_EDGES = Parameter("stop_frequency", "Hz", "edge of the stop-band, or two for a band", Edges())
STOP_WEIGHT = Parameter("stop_weight", "", "weight of the stop-band, the pass-band's is 1", Above(0.0, 1e6), default=1.0)

KINDS = (
    Kind(
        "fir-window",
        "linear phase by a window, about -6 dB at the edges",
        WINDOW_SOURCE,
        (RESPONSE, TAPS, EDGES, WINDOW, BETA),
        windowed,
        alternatives=("window", "beta"),
        conflicts=_window_conflicts,
    ),
    Kind(
        "fir-least-squares",
        "linear phase, the least squared error over pass-band and stop-band",
        LEAST_SQUARES_SOURCE,
        (RESPONSE, SOLVED_TAPS, PASS_EDGES, STOP_EDGES, STOP_WEIGHT),
        least_squares,
        conflicts=_odd_conflicts,
    ),
    Kind(
        "fir-equiripple",
        "linear phase, equal ripple in each band, the least there is",
        EQUIRIPPLE_SOURCE,
        (RESPONSE, SOLVED_TAPS, PASS_EDGES, STOP_EDGES, STOP_WEIGHT),
        equiripple,
        conflicts=_band_conflicts,
    ),
)
