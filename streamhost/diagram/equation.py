"""The difference equation that a diagram computes, as text.

One equation for each output, with nothing cancelled: the recursion stays as drawn, so that a running sum reads
y[n] = x[n] - x[n-8] + y[n-1] and not as the FIR that it equals. Or one equation for each node.
The arithmetic is the ideal one: a register is what it takes in, a residue is 0.
"""

import re
from collections.abc import Iterator, Sequence
from fractions import Fraction

import numpy as np
from numpy.typing import NDArray

from streamhost.diagram.diagram import Diagram
from streamhost.diagram.difference import difference
from streamhost.diagram.graph import loops
from streamhost.diagram.nodes import Delay, Gain, Input, Node, Output, Residue, Round, Shift, Sum, Taps
from streamhost.diagram.rows import tap_weights
from streamhost.diagram.transfer import float_transfer_function
from streamhost.errors import DiagramError

WIDTH = 100
MOST_DIGITS = 17
DUST = 1e-14
IN_FLOAT64 = f"""# not exact: the loops are too large for fractions; computed in float64,
# and what is below {DUST:g} of the largest coefficient is left out"""

Term = tuple[float, str, int]
"""A coefficient, a signal's name and its age."""


def equation(diagram: Diagram, digits: int | None = None, channel: int = 0, *, width: int | None = WIDTH,
             marked: bool = True) -> str:
    """y[n] = x terms by age, then y terms by age, wrapped to a width; `marked`: below each whether it is recursive.

    One input is x and one output y; of several each has its label where all labels can be names, else x1, x2, y1, y2.
    Each coefficient is exact and then rounded once, but for loops too large for fractions, which a comment then says.
    """
    _check(digits)
    inputs, outputs = _names(diagram)
    blocks = []
    for which, name in enumerate(outputs):
        numerators, denominator, exact = _polynomials(diagram, which, channel)
        now = [(c, x, age) for x, numerator in zip(inputs, numerators, strict=True) for age, c in enumerate(numerator)]
        past = [(-c, name, age) for age, c in enumerate(denominator) if age and c]
        terms = _texts([term for term in [*now, *past] if term[0]], digits)
        lines = [_wrapped(f"{name}[n]", terms, width)]
        lines += [_mark(name, bool(past), diagram.has_loop())] if marked else []
        blocks.append("\n".join(lines if exact else [*lines, IN_FLOAT64]))
    return "\n".join(blocks)


def node_equations(diagram: Diagram, digits: int | None = None, channel: int = 0) -> str:
    """One line for each node in evaluation order, by label; what is in a loop is marked as recursive."""
    _check(digits)
    recursive = {index for loop in loops(diagram.readers) for index in loop}
    coefficients = [float(c) for c in diagram.values[:, channel]]
    lines = []
    for index in diagram.order:
        line = _node_line(diagram, diagram.nodes[index], coefficients, digits)
        lines.append(f"{line}  # recursive" if index in recursive else line)
    return "\n".join(lines)


def _check(digits: int | None) -> None:
    if digits is not None and (isinstance(digits, bool) or not isinstance(digits, int) or not 1 <= digits <= MOST_DIGITS):
        raise DiagramError(f"digits = {digits!r} is not possible: 1 to {MOST_DIGITS} significant digits, or None for as "
                           f"many as read back to the same float64.")


def _names(diagram: Diagram) -> tuple[list[str], list[str]]:
    """What inputs and outputs are called in an equation."""
    inputs, outputs = ([diagram.nodes[i].label for i in indices] for indices in (diagram.inputs, diagram.outputs))
    labels = [*(inputs if len(inputs) > 1 else ["x"]), *(outputs if len(outputs) > 1 else ["y"])]
    if len(set(labels)) < len(labels) or not all(re.fullmatch(r"[A-Za-z]\w*", label) and label != "n" for label in labels):
        labels = [*_numbered("x", len(inputs)), *_numbered("y", len(outputs))]
    return labels[: len(inputs)], labels[len(inputs):]


def _numbered(stem: str, count: int) -> list[str]:
    return [stem] if count == 1 else [f"{stem}{i + 1}" for i in range(count)]


def _polynomials(diagram: Diagram, which: int, channel: int) -> tuple[list[list[float]], list[float], bool]:
    """Of one output the numerator of each input, the denominator, and whether each coefficient is exact, rounded once."""
    try:
        exact = difference(diagram, diagram.outputs[which], channel)
    except DiagramError:
        rounded = float_transfer_function(diagram, channel)
        return list(map(_without_dust, rounded.numerators[which])), _without_dust(rounded.denominator), False
    return [_rounded(numerator) for numerator in exact.numerators], _rounded(exact.denominator), True


def _rounded(polynomial: Sequence[Fraction]) -> list[float]:
    try:
        return [float(c) for c in polynomial]
    except OverflowError:
        raise DiagramError("A coefficient of the diagram's equation is larger than float64 holds (about 1.8e308). Its "
                           "equation can be had node by node.") from None


def _without_dust(polynomial: NDArray[np.float64]) -> list[float]:
    """What transforms leave where a coefficient is 0 is made 0 again."""
    kept: list[float] = np.where(np.abs(polynomial) < DUST * np.abs(polynomial).max(), 0.0, polynomial).tolist()
    return kept


def _mark(name: str, recursive: bool, has_loop: bool) -> str:
    if recursive:
        return f"# recursive: {name}[n] depends on its own past"
    return "# not recursive" + (", although the diagram has a loop" if has_loop else "")


def _node_line(diagram: Diagram, node: Node, coefficients: Sequence[float], digits: int | None) -> str:
    if isinstance(node, Input):
        return f"{node.label}[n] = input"
    terms = list(_node_terms(diagram, node, coefficients))
    right = " ".join(_texts(terms, digits))
    match node:
        case Output():
            return f'output "{node.label}" = {right}'
        case Round():
            return f"{node.label}[n] = round({right})"
        case Residue():
            return f"{node.label}[n] = what rounding dropped from {right}"
    return f"{node.label}[n] = {right}"


def _node_terms(diagram: Diagram, node: Node, coefficients: Sequence[float]) -> Iterator[Term]:
    """What a node adds up."""
    sources = [diagram.nodes[source].label for source in node.reads]
    match node:
        case Output() | Round() | Residue():
            yield 1.0, sources[0], 0
        case Delay(n=n):
            yield 1.0, sources[0], n
        case Gain(coefficient=slot):
            yield coefficients[slot], sources[0], 0
        case Shift(k=k):
            yield 2.0**k, sources[0], 0
        case Sum(terms=terms):
            yield from ((float(term.sign), source, 0) for term, source in zip(terms, sources, strict=True))
        case Taps():
            yield from ((c, sources[0], age) for age, c in enumerate(tap_weights(node, coefficients, 0.0)))
        case _:
            raise AssertionError(f"no equation for a {node.kind}")


def _texts(terms: Sequence[Term], digits: int | None) -> list[str]:
    """Each term with its sign in front; the first has it only where it is a minus."""
    texts: list[str] = []
    for c, name, age in terms:
        number = repr(abs(c)) if digits is None else f"{abs(c):.{digits}g}"
        factor = "" if number in ("1", "1.0") else f"{number.removesuffix('.0')} "
        sign = "-" if c < 0 else "+" if texts else ""
        gap = " " if texts else ""
        texts.append(f"{sign}{gap}{factor}{name}[n-{age}]" if age else f"{sign}{gap}{factor}{name}[n]")
    return texts


def _wrapped(left: str, terms: Sequence[str], width: int | None) -> str:
    """left = terms, in lines of at most that width unless one term is longer, what follows indented below the first term."""
    lines, indent = [f"{left} ="], " " * (len(left) + 3)
    for term in terms or ["0"]:
        if width is not None and len(lines[-1]) + 1 + len(term) > width and lines[-1].strip() != f"{left} =":
            lines.append(indent + term)
        else:
            lines[-1] += f" {term}"
    return "\n".join(lines)
