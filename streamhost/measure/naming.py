"""What a rounding of a program is called, for a reader who knows the diagram as drawn."""

from streamhost.diagram.nodes import Delay, Gain, Input, Output, Round, Sum
from streamhost.program.program import Program
from streamhost.program.sources import Source


def rounding_name(program: Program, index: int) -> str:
    """"the output", "the operand y" or "the register y", by what reads the Round at `index` and what it reads."""
    nodes, node = program.nodes, program.nodes[index]
    assert isinstance(node, Round), "only a Round is a rounding"
    readers = [nodes[reader] for reader in program.diagram.readers[index]]
    if all(isinstance(reader, Output) for reader in readers):
        return "the output"
    source = nodes[node.source]
    stored = isinstance(source, Delay | Input | Round) or (isinstance(source, Sum) and source.exact)
    multiplied = stored and all(isinstance(reader, Gain) for reader in readers)
    return f"the {'operand' if multiplied else 'register'} {_drawn_label(program, node.label)}"


def source_name(program: Program, source: Source) -> str:
    """A source of noise: as its rounding is called, or, inside a sum, as the term is."""
    node = source.places[0][0]
    return rounding_name(program, node) if isinstance(program.nodes[node], Round) else source.label


def _drawn_label(program: Program, label: str) -> str:
    """The node as drawn that a node of the program comes from: programs put suffixes behind its label."""
    drawn = {node.label for node in program.drawn.nodes}
    shorter = label
    while shorter not in drawn and "." in shorter:
        shorter = shorter.rpartition(".")[0]
    return shorter if shorter in drawn else label
