"""Transfer functions of a diagram: exact on the coefficients as stored, and in float64."""

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from itertools import islice

import numpy as np
from numpy.typing import ArrayLike, NDArray

from streamhost.diagram.diagram import Diagram
from streamhost.diagram.exact import impulse_responses
from streamhost.diagram.fan import impulse_response
from streamhost.diagram.loop_matrices import Entry, loop_matrices
from streamhost.diagram.polynomials import (
    Polynomial,
    common_factor,
    determinant,
    determinant_bits,
    product,
    quotient,
    trimmed,
)
from streamhost.errors import DiagramError

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]

MOST_WORK = 2.0**36
QUICK_WORK = 2.0**30


@dataclass(frozen=True, eq=False)
class TransferFunction:
    """Polynomials in z^-1, lowest power first, over one denominator that begins with 1.

    numerators: (outputs, inputs, coefficients); denominator: (coefficients,).
    """

    numerators: FloatArray
    denominator: FloatArray

    def at(self, z: ArrayLike) -> ComplexArray:
        """The values at complex points, shape z.shape + (outputs, inputs)."""
        inverse = 1.0 / np.asarray(z, dtype=np.complex128)
        numerators = np.moveaxis(_horner(np.moveaxis(self.numerators, -1, 0), inverse), (0, 1), (-2, -1))
        values: ComplexArray = numerators / _horner(self.denominator, inverse)[..., None, None]
        return values

    def response(self, w: ArrayLike) -> ComplexArray:
        """The frequency response at angles in radians a frame, shape w.shape + (outputs, inputs)."""
        return self.at(np.exp(1j * np.asarray(w, dtype=np.float64)))


@dataclass(frozen=True)
class ExactTransferFunction:
    """The same in fractions: numerators[output][input], each without zeros at its highest powers."""

    numerators: tuple[tuple[tuple[Fraction, ...], ...], ...]
    denominator: tuple[Fraction, ...]


def exact_transfer_function(diagram: Diagram, channel: int = 0, *,
                            most_work: float = MOST_WORK) -> ExactTransferFunction:
    """The transfer function of the coefficients as stored, in lowest terms.

    The denominator is the product of the determinants of the loops; as many frames of the impulse response as there
    are states, and one, times it are the numerators; what all have in common is divided out, so that a running sum
    gives its FIR. Raises DiagramError where that would take more than about `most_work` word operations.
    """
    matrices = loop_matrices(diagram, channel)
    if _work(diagram, channel, matrices) > most_work:
        raise DiagramError(f"The diagram has {diagram.counts().delays} states, too many in its loops for an exact "
                           f"transfer function; transfer_function gives it in float64.")
    denominator: Polynomial = [Fraction(1)]
    for matrix in matrices:
        denominator = product(denominator, determinant(matrix))
    frames = diagram.counts().delays + 1
    columns = []
    for i in range(len(diagram.inputs)):
        responses = zip(*islice(impulse_responses(diagram, channel, i), frames), strict=True)
        columns.append([product(list(map(Fraction, h)), denominator)[:frames] for h in responses])
    shared = _shared(denominator, [trimmed(numerator) for column in columns for numerator in column])
    reduced = [[tuple(quotient(trimmed(numerator), shared)) for numerator in column] for column in columns]
    return ExactTransferFunction(tuple(zip(*reduced, strict=True)), tuple(quotient(denominator, shared)))


def transfer_function(diagram: Diagram, channel: int = 0) -> TransferFunction:
    """The transfer function in float64: the exact one rounded where that is quick, else `float_transfer_function`."""
    if _work(diagram, channel, loop_matrices(diagram, channel)) <= QUICK_WORK:
        return _rounded(exact_transfer_function(diagram, channel))
    return float_transfer_function(diagram, channel)


def float_transfer_function(diagram: Diagram, channel: int = 0) -> TransferFunction:
    """The transfer function in float64, nothing cancelled: determinants of the loops from values on the unit circle."""
    denominator = np.ones(1)
    for matrix in loop_matrices(diagram, channel):
        denominator = np.convolve(denominator, _determinant_by_fft(matrix))
    frames = diagram.counts().delays + 1
    responses = [impulse_response(diagram, channel, input=i, frames=frames) for i in range(len(diagram.inputs))]
    numerators = [[np.convolve(h, denominator)[:frames] for h in response.T] for response in responses]
    return TransferFunction(np.array(numerators).transpose(1, 0, 2), denominator)


def _shared(denominator: Polynomial, numerators: Sequence[Polynomial]) -> Polynomial:
    """What divides all of them, with the constant term 1."""
    shared = denominator
    for numerator in numerators:
        shared = common_factor(shared, numerator)
        if len(shared) == 1:
            break
    return [c / shared[0] for c in shared]


def _work(diagram: Diagram, channel: int, matrices: Sequence[list[list[Entry]]]) -> float:
    """Word operations that the determinants and the growing impulse response take, as an order of magnitude."""
    work = sum(len(matrix) ** 3 * (determinant_bits(matrix) / 32.0) ** 2 for matrix in matrices)
    if matrices:
        finest = max((Fraction(float(c)).denominator.bit_length() - 1 for c in diagram.values[:, channel]), default=0)
        states = diagram.counts().delays
        work += len(diagram.nodes) * states * (states * finest / 32.0) ** 2
    return work


def _rounded(exact: ExactTransferFunction) -> TransferFunction:
    length = max(len(n) for row in exact.numerators for n in row)
    padded = [[[*map(float, n), *[0.0] * (length - len(n))] for n in row] for row in exact.numerators]
    return TransferFunction(np.array(padded), np.array([float(c) for c in exact.denominator]))


def _determinant_by_fft(matrix: list[list[Entry]]) -> FloatArray:
    """The determinant's coefficients from its values on the unit circle."""
    degree = sum(max(max(entry, default=0) for entry in row) for row in matrix)
    points = 1 << degree.bit_length()
    coefficients = np.zeros((points, len(matrix), len(matrix)))
    for i, row in enumerate(matrix):
        for j, entry in enumerate(row):
            for power, c in entry.items():
                coefficients[power, i, j] = float(c)
    values = np.linalg.det(np.fft.fft(coefficients, axis=0))
    result: FloatArray = np.fft.ifft(values).real[: degree + 1]
    return result


def _horner(coefficients: FloatArray, x: ComplexArray) -> ComplexArray:
    """The polynomials along the first axis at every x, shape coefficients.shape[1:] + x.shape."""
    shape = coefficients.shape[1:] + (1,) * x.ndim
    value = np.zeros(coefficients.shape[1:] + x.shape, dtype=np.complex128)
    for c in coefficients[::-1]:
        value = value * x + c.reshape(shape)
    return value
