"""What the tests of the low-noise forms share: random filters, the bound of float64's rounding, Gramians, noise gains."""

import numpy as np
from error_norms import noise_gains
from scipy import linalg

from streamhost import Filter, Fixed, design
from streamhost.diagram import Diagram
from streamhost.filters import Polynomials
from streamhost.formats import named_format
from streamhost.measure.predicted import predicted_noise
from streamhost.program.run import lower, run_definition
from streamhost.structures import build

RATE = 48000
SINE_DB = 20.0 * np.log10(2.0**0.5)  # dBFS of a full-scale sine over that of its power
FINE = Fixed("Q1.23", coefficients={"bits": 32, "point": "coefficient"})


def random_filter(order: int, seed: int, radius: float = 0.95) -> Filter:
    """Stable, of real zeros and poles or conjugate pairs."""
    rng = np.random.default_rng(seed)

    def roots(largest: float) -> list[complex]:
        pairs = rng.integers(0, order // 2 + 1)
        upper = largest * rng.uniform(0.1, 1, pairs) * np.exp(1j * rng.uniform(0.1, 3, pairs))
        return [*upper, *upper.conj(), *rng.uniform(-largest, largest, order - 2 * pairs)]

    return Filter.from_zeros_poles(roots(1.0), roots(radius), 0.7, rate=RATE)


def section(b: list[float], a: list[float]) -> Filter:
    return Filter.from_sections([[*(b + [0.0, 0.0])[:3], *(a + [0.0, 0.0])[:3]]], rate=RATE)


def low_pass(frequency: float, q: float = 0.5**0.5) -> Filter:
    return design("low-pass", rate=RATE, frequency=frequency, q=q)


def poles_at(radius: float, angle: float) -> list[float]:
    """1 - 2 r cos(angle) z^-1 + r^2 z^-2."""
    return [1.0, -2.0 * radius * float(np.cos(angle)), radius**2]


def in_float64(diagram: Diagram, x: np.ndarray) -> np.ndarray:
    return run_definition(lower(diagram, named_format("float64")), x[:, np.newaxis])[:, 0, 0]


def by_definition(sections: tuple[Polynomials, ...], x: np.ndarray) -> np.ndarray:
    """scipy's filter, section after section."""
    from scipy import signal

    for each in sections:
        x = signal.lfilter(each.b, each.a, x)
    return x


def gramians(diagram: Diagram) -> tuple[np.ndarray, np.ndarray]:
    """K and W of a diagram's states, by scipy; for poles far enough from the circle."""
    space = diagram.state_space()
    k = linalg.solve_discrete_lyapunov(space.A, space.B @ space.B.T)
    return k, linalg.solve_discrete_lyapunov(space.A.T, space.C.T @ space.C)


def rounding_gain(filter: Filter, form: str, label: str = "y") -> float:
    """The power at the output of a rounding of power 1 at a node, of the coefficients as drawn."""
    diagram = build(filter, form=form).diagram
    (node,) = (index for index, each in enumerate(diagram.nodes) if each.label == label and each.kind != "output")
    return float(noise_gains(diagram, [node])[0])


def noise_gain(filter: Filter, form: str, decomposition: str = "cascade", format: Fixed = FINE) -> float:
    """The predicted noise power at the output, 0 to half the rate, in units of one rounding into the signal's word."""
    program = lower(build(filter, form=form, decomposition=decomposition).diagram, format)
    level = predicted_noise(program, RATE).full_dbfs - SINE_DB
    return float(10.0 ** (level / 10.0) * 12.0 * 4.0**format.signal.word.fraction)
