"""A realization: filter + decomposition + form + format, with its state. The thing that runs."""

from collections import deque
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, TypeVar

import numpy as np
from numpy.typing import ArrayLike, NDArray

from streamhost.diagram import Diagram
from streamhost.errors import FilterError, FormatError, RequestError
from streamhost.filters import Filter
from streamhost.formats import Fixed, Float, Format, named_format, parse_word
from streamhost.program.carrying import Carried, carry, is_run
from streamhost.program.hazards import hazards_of
from streamhost.program.poles import running_sums, unstable_poles_in
from streamhost.program.program import Program
from streamhost.program.run import lower
from streamhost.structures import Built, build

if TYPE_CHECKING:
    from streamhost.program.native.kernel import Kernel, Memory, Variant

MOST_SAMPLE_BITS = 53
MOST_HISTORY = 1 << 16
"""Frames of past input that are kept for a realization that takes over and holds past input."""

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

    `filters` is what was asked for: one filter, or one for each channel. `diagram` is the block diagram as drawn, with the
    coefficients before rounding; `program` the same with every rounding explicit and the coefficients as stored.
    """

    def __init__(self, filter: Filter | Sequence[Filter], built: Built, format: Format) -> None:
        self.filters = (filter,) if isinstance(filter, Filter) else tuple(filter)
        self.built, self.format = built, format
        self.diagram: Diagram = built.diagram
        self.program: Program = lower(built.diagram, format)
        self._memory: Memory | None = None
        self._kernels: dict[Variant, Kernel] = {}
        self._recent: deque[NDArray[np.generic]] = deque()

    def __repr__(self) -> str:
        return f"<Realization {self.form} · {self.decomposition} · {self.format.label}, {self.diagram.counts()}>"

    @property
    def filter(self) -> Filter:
        """What was asked for, of the first channel where channels differ."""
        return self.filters[0]

    @property
    def rate(self) -> float:
        """In hertz."""
        return self.filter.rate

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

    @property
    def unstable_as_asked(self) -> bool:
        """Whether a filter as asked has a pole on or outside the unit circle, before any rounding."""
        return any(filter.unstable_poles() for filter in self.filters)

    @cached_property
    def hazards(self) -> tuple[str, ...]:
        """What is certain to be dangerous about this structure in this format, in sentences."""
        return (*self.built.hazards, *hazards_of(self.program))

    @cached_property
    def unstable(self) -> int:
        """Poles of the diagram with its coefficients as stored that lie on or outside the unit circle, decided exactly.

        Without those of running sums that lose nothing, which zeros cancel exactly.
        """
        return unstable_poles_in(self.program.diagram) - running_sums(self.program)[0]

    @property
    def unstable_since(self) -> str:
        """Where the unstable poles come from, in words that follow "unstable"."""
        if self.unstable_as_asked:
            return "as asked"
        return "as drawn" if unstable_poles_in(self.diagram) else "with its coefficients rounded"

    def check_samples(self, name: str = "this realization") -> None:
        """RequestError where the input's or the output's word is longer than a sample in float64; `name` is its subject."""
        if not isinstance(self.format, Fixed):
            return
        words = {"input": self.format.input.word, "output": self.format.output.word}
        long = [f"{place} = {word}, {word.bits} bits" for place, word in words.items() if word.bits > MOST_SAMPLE_BITS]
        if long:
            raise RequestError(
                f"{name} has {' and '.join(long)}: samples are float64, which holds {MOST_SAMPLE_BITS} bits, and longer "
                'words come in and go out as codes only (process_codes). State a shorter one, for instance "Q1.31", for '
                "what comes in and what goes out; signal, state and operand stay as long as they are."
            )

    def process(self, x: ArrayLike) -> NDArray[np.float64]:
        """Filter a block of samples, 1.0 = full scale.

        x: (frames,) or (frames, channels), of as many channels as the blocks before it. Returns the same shape; with
        several outputs (frames, outputs, channels). Raises RequestError for another shape or number of channels, and
        where input or output has a word of more than 53 bits.
        """
        self.check_samples()
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
        self._recent.clear()

    def carry_from(self, other: "Realization") -> Carried:
        """Take over from another realization: the state whose output, without input, is nearest to the other's.

        Any two of one rate and with an output in common, whatever their filters, forms and formats; this one's own state
        is lost. States that hold past input are set from it, residues start at 0. See `diagram/carrying.py`.
        Raises RequestError where the rates differ, no output is common, or coefficients are of another number of channels,
        and as `process` does where the state comes of running over past input.
        """
        if self.filter.rate != other.filter.rate:
            raise RequestError(f"A state at {other.filter.rate:g} Hz cannot be carried to {self.filter.rate:g} Hz.")
        run = is_run(self.program)
        if run:
            self.check_samples()
        self.reset()
        if other._memory is None:
            return Carried("copied", 0.0, 0)
        self._memory = self.memory(other._memory.channels)
        past = other._past()
        if run:
            self._run(past[-self.program.state_words :], codes=False)
            carried = Carried("run", None, 0)
        else:
            carried = carry(other.program, other._memory, self.program, self._memory, self.filter.rate, past)
        self._recent = deque([past])
        return carried

    def _past(self) -> NDArray[np.float64]:
        """The input of the last frames, (frames, channels), oldest first, 1.0 = full scale."""
        step = 2.0**-self.format.input.word.fraction if isinstance(self.format, Fixed) else 1.0
        blocks = [block.astype(np.float64) * (step if block.dtype == np.int64 else 1.0) for block in self._recent]
        assert self._memory is not None, "only what has run has a past"
        past: NDArray[np.float64] = np.vstack([np.zeros((0, self._memory.channels)), *blocks])
        return np.where(np.isnan(past), 0.0, past)

    def _remember(self, block: NDArray[np.generic]) -> None:
        self._recent.append(block[-MOST_HISTORY:].copy())
        while sum(map(len, self._recent)) - len(self._recent[0]) >= MOST_HISTORY:
            self._recent.popleft()

    def tally(self) -> Tally:
        """What happened since reset."""
        return tally(self.program, self._memory.meters if self._memory is not None else None)

    def source(self, *, codes: bool = False, metered: bool = True) -> str:
        """The readable source of the kernel that `process` runs, or of the one for codes, or without meters.

        Raises RequestError as `process` does.
        """
        from streamhost.program.native.kernel import Variant, kernel_source

        if not codes:
            self.check_samples()
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
        self._kernel(codes, channels).call(self._memory, np.ascontiguousarray(block), y, marks=marks, trace=no_trace())
        self._remember(block)
        if len(self.outputs) > 1:
            return y.reshape(frames, len(self.outputs), channels)
        return y[:, 0] if x.ndim == 1 else y

    def _kernel(self, codes: bool, channels: int) -> "Kernel":
        from streamhost.program.native.kernel import Variant, compile_kernel, kernel_width

        variant = Variant(codes=codes, metered=True, width=kernel_width(self.program, channels))
        if variant not in self._kernels:
            self._kernels[variant] = compile_kernel(self.program, variant)
        return self._kernels[variant]


def tally(program: Program, meters: NDArray[np.int64] | None) -> Tally:
    """The meters of a kernel by kind; all zero without meters."""
    from streamhost.program.native.meters import meters_by_kind

    if meters is None:
        return Tally(0, 0, 0, 0)
    return Tally(int(meters[0]), *(sum(int(meters[k]) for k in kind) for kind in meters_by_kind(program)))


def realize(
    filter: Filter | Sequence[Filter],
    *,
    form: str = "transposed-2",
    decomposition: str = "cascade",
    pairing: str | None = None,
    ordering: str | None = None,
    scaling: str | None = None,
    outputs: str | None = None,
    format: Format | str = "float64",
    allow_unstable: bool = False,
) -> Realization:
    """A filter realized: divided, drawn, and put into an arithmetic. Of a sequence, each is the filter of a channel.

    `format` is a Fixed, a Float or the name of a shipped arithmetic. Choices left at None take the defaults: pairing
    nearest, ordering outward, scaling none; a filter given as sections keeps them. `outputs` "all" adds those that a form
    offers beside the filter's own.
    Raises FilterError for a filter that is unstable as asked (unless allowed), StructureError, FormatError.
    """
    filters = (filter,) if isinstance(filter, Filter) else _of_channels(filter)
    if not isinstance(format, Fixed | Float | str):
        raise FormatError(f"format = {format!r} is no Fixed, no Float and no name of an arithmetic.")
    if not allow_unstable:
        _check_stable(filters)
    arithmetic = named_format(format) if isinstance(format, str) else format
    built = build(filters, form=form, decomposition=decomposition, pairing=pairing, ordering=ordering, scaling=scaling,
                  outputs=outputs)
    return Realization(filters, built, _with_codes(filters, arithmetic))


def _check_stable(filters: Sequence[Filter]) -> None:
    worst = max(filters, key=Filter.unstable_poles)
    if not (poles := worst.unstable_poles()):
        return
    lie = "lies" if poles == 1 else "lie"
    cancelled = worst.cancelled_poles()
    but = f" Zeros cancel {cancelled} of them in the response, and nothing of what their loop loses." if cancelled else ""
    raise FilterError(
        f"The filter as asked is unstable: {poles} of its poles {lie} on or outside the unit circle.{but} State "
        f"allow_unstable = true to run it all the same."
    )


def _of_channels(given: object) -> tuple[Filter, ...]:
    """The filters of channels that can run through one diagram."""
    filters = tuple(given) if isinstance(given, Sequence) else ()
    if not filters or not all(isinstance(each, Filter) for each in filters):
        raise FilterError(f"realize takes a Filter, not {type(given).__name__}, or a sequence with one for each channel. "
                          "streamhost.design makes one.")
    for what, found in (("rates", {each.rate for each in filters}), ("outputs", {each.outputs for each in filters})):
        if len(found) > 1:
            raise FilterError(f"The filters of the channels have different {what}; all channels have the same.")
    return filters


def _with_codes(filters: Sequence[Filter], format: Format) -> Format:
    """The format with the word of filters given as codes at its `coefficients` place."""
    given = sorted({"" if each.codes is None else each.codes.word for each in filters})
    if given == [""] or not isinstance(format, Fixed):
        return format
    if len(given) > 1:
        raise FilterError("The filter of one channel is given as codes, and that of another is not, or as codes of another "
                          "word. All channels have coefficients of one word.")
    word = parse_word(given[0], "word", least_integer=-999)
    if format.coefficients_stated and format.coefficients.word != word:
        raise FormatError(
            f"The filter is given as codes of {word}, which they keep: leave `coefficients` out of the format."
        )
    return format.with_coefficient_word(word)

