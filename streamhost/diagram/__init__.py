"""Signal-flow graphs: nodes, builder, legality, evaluation order, linear analysis."""

from streamhost.diagram.builder import Builder, Ref, minus
from streamhost.diagram.diagram import Counts, Diagram
from streamhost.diagram.nodes import Delay, Gain, Input, Node, Output, Residue, Round, Shift, Slot, Sum, Taps, Term

__all__ = [
    "Builder",
    "Counts",
    "Delay",
    "Diagram",
    "Gain",
    "Input",
    "Node",
    "Output",
    "Ref",
    "Residue",
    "Round",
    "Shift",
    "Slot",
    "Sum",
    "Taps",
    "Term",
    "minus",
]
