"""Decompositions and forms: how a filter becomes a diagram. The only place that knows both."""

from streamhost.structures.built import Built, build
from streamhost.structures.choices import DECOMPOSITIONS, ORDERINGS, OUTPUTS, PAIRINGS, SCALINGS, decompositions
from streamhost.structures.form import Draft, Form, Size
from streamhost.structures.forms import form, forms
from streamhost.structures.own import load_structures

__all__ = [
    "DECOMPOSITIONS", "ORDERINGS", "OUTPUTS", "PAIRINGS", "SCALINGS", "Built", "Draft", "Form", "Size", "build",
    "decompositions", "form", "forms", "load_structures",
]
