"""A realization: filter + decomposition + form + format, with its state. The thing that runs."""

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, TypeVar

import numpy as np
from numpy.typing import ArrayLike, NDArray

from streamhost.diagram import Diagram
from streamhost.diagram.loop_matrices import loop_matrices
from streamhost.diagram.polynomials import determinant
from streamhost.errors import FilterError, FormatError, RequestError
from streamhost.filters import Filter, Polynomials
from streamhost.filters.stability import unstable_poles
from streamhost.formats import Fixed, Float, Format, named_format, parse_word
from streamhost.program.program import Program
from streamhost.program.run import lower
from streamhost.structures import Built, build

if TYPE_CHECKING:
    from streamhost.program.native.kernel import Kernel, Memory

MOST_REAL_BITS = 53
Scalar = TypeVar("Scalar", bound=np.generic)


@dataclass(frozen=True)
class Tally:
    """What happened since reset: NaN samples that came in, registers that saturated or wrapped, lost accumulators."""

    not_a_number: int
    saturations: int
    wraps: int
    accumulator_overflows: int


class Realization:
    """A filter in a structure and a format. State is kept from call to call; `reset` clears it.

    `diagram` is the block diagram as drawn, with the coefficients before rounding; `program` the same with every
    rounding explicit and the coefficients as stored.
    """

    def __init__(self, filter: Filter, built: Built, format: Format) -> None:
        self.filter, self.built, self.format = filter, built, format
        self.diagram: Diagram = built.diagram
        self.program: Program = lower(built.diagram, format)
        self._memory: Memory | None = None
        self._kernels: dict[bool, Kernel] = {}

    def __repr__(self) -> str:
        return f"<Realization {self.form} · {self.decomposition} · {self.format.label}, {self.diagram.counts()}>"

    @property
    def form(self) -> str:
        return self.built.form

    @property
    def decomposition(self) -> str:
        return self.built.decomposition

    @property
    def outputs(self) -> tuple[str, ...]:
        """Names of the outputs."""
        return tuple(self.diagram.nodes[index].label for index in self.diagram.outputs)

    @cached_property
    def unstable(self) -> int:
        """Poles of the diagram with its coefficients as stored that lie on or outside the unit circle, decided exactly."""
        return max(_unstable_in(self.program.diagram, channel) for channel in range(self.program.diagram.channels))

    def process(self, x: ArrayLike) -> NDArray[np.float64]:
        """Filter a block of samples, 1.0 = full scale.

        x: (frames,) or (frames, channels), of as many channels as the blocks before it. Returns the same shape; with
        several outputs (frames, outputs, channels). Raises RequestError for another shape or number of channels.
        """
        if (
            isinstance(self.format, Fixed)
            and max(self.format.input.word.bits, self.format.output.word.bits) > MOST_REAL_BITS
        ):
            raise RequestError(f"Samples of {self.format.input.word} do not fit a float64. Use process_codes.")
        samples = np.asarray(x)
        if samples.dtype.kind not in "fiub":
            raise RequestError(f"process takes real numbers, not {samples.dtype}.")
        return self._run(samples.astype(np.float64, copy=False), codes=False)

    def process_codes(self, codes: ArrayLike) -> NDArray[np.int64]:
        """Filter a block of integers: codes of the input's word in, codes of the output's word out.

        codes: int64 of shape (frames,) or (frames, channels). Raises RequestError for a code out of the word's range,
        for anything but integers, and for a floating-point format.
        """
        if not isinstance(self.format, Fixed):
            raise RequestError(f"{self.format.label} has no codes. Use process.")
        array = np.asarray(codes)
        if array.size and array.dtype.kind not in "iu":
            raise RequestError(f"process_codes takes integers, not {array.dtype}.")
        word = self.format.input.word
        if array.size and not word.low <= int(array.min()) <= int(array.max()) <= word.high:
            raise RequestError(
                f"A code of {word} runs from {word.low} to {word.high}; the block holds codes from "
                f"{array.min()} to {array.max()}."
            )
        return self._run(array.astype(np.int64), codes=True)

    def reset(self) -> None:
        """Zero state, as after construction."""
        self._memory = None

    def tally(self) -> Tally:
        """What happened since reset."""
        return tally(self.program, self._memory.meters if self._memory is not None else None)

    def source(self, *, codes: bool = False, metered: bool = True) -> str:
        """The readable source of the kernel that `process` runs, or of the one for codes, or without meters."""
        from streamhost.program.native.kernel import Variant, kernel_source

        return kernel_source(self.program, Variant(codes=codes, metered=metered))

    def memory(self, channels: int) -> "Memory":
        """Fresh working memory for a kernel of this realization: state, coefficients, keys, meters."""
        from streamhost.program.native.kernel import Memory

        if self.diagram.channels not in (1, channels):
            raise RequestError(
                f"This realization has coefficients for {self.diagram.channels} channels, and {channels} came."
            )
        return Memory(self.program, channels)

    def _run(self, x: NDArray[Scalar], *, codes: bool) -> NDArray[Scalar]:
        from streamhost.program.native.kernel import no_trace

        block = x[:, np.newaxis] if x.ndim == 1 else x
        if block.ndim != 2 or block.shape[1] < 1:
            raise RequestError(f"A block is (frames,) or (frames, channels); this one has the shape {x.shape}.")
        frames, channels = block.shape
        if self._memory is None:
            self._memory = self.memory(channels)
        if self._memory.channels != channels:
            before = self._memory.channels
            raise RequestError(f"Number of channels: {before} in the blocks before, {channels} in this one. reset() first.")
        y = np.empty((frames, len(self.outputs) * channels), block.dtype)
        marks = np.zeros(block.shape, np.uint8)
        self._kernel(codes).call(self._memory, np.ascontiguousarray(block), y, marks=marks, trace=no_trace())
        if len(self.outputs) > 1:
            return y.reshape(frames, len(self.outputs), channels)
        return y[:, 0] if x.ndim == 1 else y

    def _kernel(self, codes: bool) -> "Kernel":
        from streamhost.program.native.kernel import Variant, compile_kernel

        if codes not in self._kernels:
            self._kernels[codes] = compile_kernel(self.program, Variant(codes=codes, metered=True))
        return self._kernels[codes]


def tally(program: Program, meters: NDArray[np.int64] | None) -> Tally:
    """The meters of a kernel by kind; all zero without meters."""
    from streamhost.program.native.meters import meters_by_kind

    if meters is None:
        return Tally(0, 0, 0, 0)
    return Tally(int(meters[0]), *(sum(int(meters[k]) for k in kind) for kind in meters_by_kind(program)))


def realize(
    filter: Filter,
    *,
    form: str = "transposed-2",
    decomposition: str = "cascade",
    pairing: str | None = None,
    ordering: str | None = None,
    scaling: str | None = None,
    format: Format | str = "float64",
    allow_unstable: bool = False,
) -> Realization:
    """A filter realized: divided, drawn, and put into an arithmetic.

    `format` is a Fixed, a Float or the name of a shipped arithmetic. Choices left at None take the defaults: pairing
    nearest, ordering outward, scaling none; a filter given as sections keeps them.
    Raises FilterError for a filter that is unstable as asked (unless allowed), StructureError, FormatError.
    """
    if not isinstance(filter, Filter):
        raise FilterError(f"realize takes a Filter, not {type(filter).__name__}. streamhost.design makes one.")
    if not isinstance(format, Fixed | Float | str):
        raise FormatError(f"format = {format!r} is no Fixed, no Float and no name of an arithmetic.")
    if (poles := filter.unstable_poles()) and not allow_unstable:
        lie = "lies" if poles == 1 else "lie"
        raise FilterError(
            f"The filter as asked is unstable: {poles} of its poles {lie} on or outside the unit circle. State "
            f"allow_unstable = true to run it all the same."
        )
    arithmetic = named_format(format) if isinstance(format, str) else format
    built = build(filter, form=form, decomposition=decomposition, pairing=pairing, ordering=ordering, scaling=scaling)
    return Realization(filter, built, _with_codes(filter, arithmetic))


def _with_codes(filter: Filter, format: Format) -> Format:
    """The format with the word of a filter given as codes at its `coefficients` place."""
    if filter.codes is None or not isinstance(format, Fixed):
        return format
    word = parse_word(filter.codes.word, "word", least_integer=-999)
    if format.coefficients_stated and format.coefficients.word != word:
        raise FormatError(
            f"The filter is given as codes of {word}, which they keep: leave `coefficients` out of the format."
        )
    return format.with_coefficient_word(word)


def _unstable_in(diagram: Diagram, channel: int) -> int:
    return sum(_unstable_poles_of(determinant(matrix)) for matrix in loop_matrices(diagram, channel))


def _unstable_poles_of(denominator: Sequence[object]) -> int:
    return unstable_poles(Polynomials((1.0,), tuple(denominator)))  # type: ignore[arg-type]
