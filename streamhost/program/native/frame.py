"""The frame around a generated kernel: signature, arrays, the two loops, states in local variables.

A kernel works on one block of `frames` x `channels` in place of its arrays, checks nothing and allocates nothing.
`frame0` is the number of frames since reset; lines longer than one word are rings that turn with it.
"""

from dataclasses import dataclass

from streamhost.diagram.nodes import Delay, Taps
from streamhost.program.native.machine import machine_hash
from streamhost.program.native.meters import meter_count
from streamhost.program.native.text import Text, comment
from streamhost.program.program import Program
from streamhost.program.sources import traced_roundings

ARGUMENTS = (
    "x_",
    "y_",
    "state_",
    "coefficients_",
    "keys_",
    "meters_",
    "marks_",
    "trace_",
    "frames",
    "channels",
    "frame0",
)


@dataclass(frozen=True)
class Variant:
    """Which kernel of a program: integer codes at its doors, meters, a trace of every rounding's residue.

    A traced floating-point kernel writes every node's value instead. `double` runs a float64 program in double-double:
    two words a state, and two columns an output. `width`: channels that run at once; the bits are the same.
    """

    codes: bool = False
    metered: bool = False
    traced: bool = False
    double: bool = False
    width: int = 1

    @property
    def words(self) -> int:
        """Machine words a value."""
        return 2 if self.double else 1


def header(text: Text, program: Program, variant: Variant, functions: str, dtype: str, title: str) -> None:
    """Everything before the loop over channels; `functions` are those that the text calls."""
    outputs, sources = variant.words * len(program.diagram.outputs), max(1, trace_width(program))
    door = "int64" if variant.codes else "float64"
    open_text(text, title, functions, variant.width)
    text(f"x = carray(x_, (frames, channels), np.{door})")
    text(f"y = carray(y_, (frames, {outputs} * channels), np.{door})")
    text(f"S = carray(state_, ({max(1, variant.words * program.state_words)}, channels), np.{dtype})")
    text(f"C = carray(coefficients_, ({max(1, len(program.diagram.slots))}, channels), np.{dtype})")
    if has_dither(program):
        text(f"K = carray(keys_, ({program.ordinals}, channels), np.uint64)")
    if variant.metered:
        text(f"M = carray(meters_, ({meter_count(program)},), np.int64)")
        text("F = carray(marks_, (frames, channels), np.uint8)")
    if variant.traced:
        text(f"R = carray(trace_, (frames, channels, {sources}), np.float64)")


def open_text(text: Text, title: str, functions: str = "", width: int = 1) -> None:
    """The start of a module, up to the body of the function that runs; `functions` are those that it calls."""
    text(f'"""{title}"""')
    text()
    text(f"# machine code {machine_hash()}")
    text("from numba import cfunc")
    text()
    text("from streamhost.program.native.machine import SIGNATURE, machine_code")
    text()
    text()
    if functions:
        text(functions)
        text()
        text()
    text(f"@machine_code({width})")
    text(f"def run({', '.join(ARGUMENTS)}):")
    text.depth = 1


def close_text(text: Text) -> None:
    """The end of a module: the C function that calls the text."""
    text()
    text()
    text('@cfunc(SIGNATURE, cache=CACHE, error_model="numpy")')
    text(f"def kernel({', '.join(ARGUMENTS)}):")
    with text.indented():
        text(f"run({', '.join(ARGUMENTS)})")


def trace_width(program: Program) -> int:
    """Columns of a traced kernel: the roundings that drop bits, or every node in floating point."""
    return len(traced_roundings(program)) if program.arithmetic else len(program.nodes)


def has_dither(program: Program) -> bool:
    return program.ordinals > 0 and any(quantizer.dither for quantizer in program.quantizers)


def lines(program: Program) -> tuple[list[int], list[int]]:
    """(single delays, held in local variables; longer lines and tapped lines, which are rings)."""
    single: list[int] = []
    rings: list[int] = []
    for index, node in enumerate(program.nodes):
        if isinstance(node, Delay | Taps) and node.stores:
            (single if isinstance(node, Delay) and node.n == 1 else rings).append(index)
    return single, rings


def open_loops(text: Text, program: Program, variant: Variant, load: str) -> None:
    """From the loop over channels to the start of a frame; `load` wraps a loaded state or coefficient."""
    single, rings = lines(program)
    text("for c in range(channels):")
    text.depth += 1
    tapped = {slot for node in program.nodes if isinstance(node, Taps) for slot in node.coefficients}
    for slot, entry in enumerate(program.diagram.slots):
        if slot not in tapped:
            text(f"k{slot} = {load.format(f'C[{slot}, c]')}{comment(entry.label)}")
    for index in single:
        text(f"s{index} = {load_state(program, index, load)}{comment(program.nodes[index].label)}")
    for index in rings:
        text(f"p{index} = frame0 % {program.nodes[index].stores}")
    if variant.metered:
        for k in range(meter_count(program)):
            text(f"m{k} = np.int64(0)")
    text("for n in range(frames):")
    text.depth += 1


def load_state(program: Program, index: int, load: str) -> str:
    """A state as a local variable of its own type."""
    offset = program.state_offsets[index]
    if program.types:
        return f"np.{program.types[index]}(S[{offset}, c])"
    return load.format(f"S[{offset}, c]")


def close_loops(text: Text, program: Program, variant: Variant) -> None:
    """Rings turned at the end of a frame; states and meters stored at the end of a channel."""
    single, rings = lines(program)
    for index in rings:
        text(f"p{index} += 1")
        text(f"if p{index} == {program.nodes[index].stores}:")
        with text.indented():
            text(f"p{index} = 0")
    text.depth -= 1
    for index in single:
        text(f"S[{program.state_offsets[index]}, c] = s{index}")
    if variant.metered:
        for k in range(meter_count(program)):
            text(f"M[{k}] += total(m{k})")
    text.depth -= 2
    close_text(text)
