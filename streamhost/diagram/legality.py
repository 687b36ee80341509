"""The rules that a diagram keeps, as a list; each has a name and says which node breaks it."""

from collections.abc import Callable, Iterator

from streamhost.diagram.diagram import Diagram
from streamhost.diagram.nodes import Delay, Gain, Input, Output, Residue, Round, Shift, Sum, Taps
from streamhost.diagram.order import delay_free_loop
from streamhost.errors import DiagramError

Rule = Callable[[Diagram], Iterator[str]]
MOST_SHIFT = 63
MOST_GROW = 48


def has_ends(diagram: Diagram) -> Iterator[str]:
    if not diagram.inputs:
        yield "has no input"
    if not diagram.outputs:
        yield "has no output"


def is_driven(diagram: Diagram) -> Iterator[str]:
    for node in diagram.nodes:
        if isinstance(node, Delay) and node.source < 0:
            yield f'has a delay "{node.label}" that nothing drives'


def is_well_formed(diagram: Diagram) -> Iterator[str]:
    for node in diagram.nodes:
        if isinstance(node, Delay) and node.n < 1:
            yield f'has a delay "{node.label}" of {node.n} frames; a delay is 1 or more'
        if isinstance(node, Sum) and not node.terms:
            yield f'has a sum "{node.label}" without a term'
        if isinstance(node, Sum) and node.grow is not None and not 0 <= node.grow <= MOST_GROW:
            yield f'has a sum "{node.label}" marked grow = {node.grow}; 0 to {MOST_GROW} bits are possible'
        if isinstance(node, Shift) and abs(node.k) > MOST_SHIFT:
            yield f'has a shift "{node.label}" by {node.k}; at most {MOST_SHIFT} either way'
        if isinstance(node, Taps) and not node.coefficients:
            yield f'has taps "{node.label}" without a coefficient'


def outputs_are_read_by_nobody(diagram: Diagram) -> Iterator[str]:
    for node in diagram.nodes:
        for source in node.reads:
            if source >= 0 and isinstance(diagram.nodes[source], Output):
                yield f'reads its output "{diagram.nodes[source].label}" in "{node.label}"'


def residues_are_of_registers(diagram: Diagram) -> Iterator[str]:
    for node in diagram.nodes:
        if isinstance(node, Residue):
            register = diagram.nodes[node.source]
            if not isinstance(register, Sum | Gain | Shift | Taps | Round):
                yield f'asks for the residue of "{register.label}", a {register.kind}, which is never rounded'


def reaches_an_output(diagram: Diagram) -> Iterator[str]:
    reached = set(diagram.outputs)
    todo = list(diagram.outputs)
    while todo:
        for source in diagram.nodes[todo.pop()].reads:
            if source >= 0 and source not in reached:
                reached.add(source)
                todo.append(source)
    for index, node in enumerate(diagram.nodes):
        if index not in reached and not isinstance(node, Input):
            yield f'has a {node.kind} "{node.label}" that reaches no output'


def has_no_delay_free_loop(diagram: Diagram) -> Iterator[str]:
    loop = delay_free_loop(diagram)
    if loop:
        labels = [diagram.nodes[i].label for i in loop]
        yield f"has a loop without a delay: {' -> '.join([*labels, labels[0]])}"


RULES: tuple[Rule, ...] = (
    has_ends, is_driven, is_well_formed, outputs_are_read_by_nobody, residues_are_of_registers, reaches_an_output,
    has_no_delay_free_loop,
)


def check_diagram(diagram: Diagram) -> None:
    """Raise DiagramError with everything that the first broken rule finds."""
    for rule in RULES:
        if found := list(rule(diagram)):
            raise DiagramError(f"The diagram {'; it '.join(found)}.")
