"""Decompositions and forms: how a filter becomes a diagram. The only place that knows both."""

from streamhost.structures.built import Built, build
from streamhost.structures.choices import DECOMPOSITIONS, ORDERINGS, PAIRINGS, SCALINGS, decompositions
from streamhost.structures.form import Form
from streamhost.structures.forms import form, forms

__all__ = [
    "DECOMPOSITIONS", "ORDERINGS", "PAIRINGS", "SCALINGS", "Built", "Form", "build", "decompositions", "form", "forms",
]
