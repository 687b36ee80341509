"""Hear, measure and hand over every realization of a digital filter in the arithmetic of its target.

import streamhost as sh

f = sh.design("peak", rate=48000, frequency=1000, gain_db=6, q=0.707)
r = sh.realize(f, form="direct-1", format=sh.Fixed("Q1.15", coefficients="Q2.14"))
y = r.process(x)
"""

from importlib import import_module
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from streamhost import measure
    from streamhost.diagram import Builder, Diagram, minus
    from streamhost.filters import Filter, design, kinds
    from streamhost.formats import Fixed, Float
    from streamhost.presets import Preset, load_preset
    from streamhost.realization import Realization, realize
    from streamhost.structures import Draft, Form, Size, decompositions, forms, load_structures

_HOMES = {
    "Builder": "diagram",
    "Diagram": "diagram",
    "minus": "diagram",
    "Filter": "filters",
    "design": "filters",
    "kinds": "filters",
    "Fixed": "formats",
    "Float": "formats",
    "Preset": "presets",
    "load_preset": "presets",
    "Realization": "realization",
    "realize": "realization",
    "Draft": "structures",
    "Form": "structures",
    "Size": "structures",
    "decompositions": "structures",
    "forms": "structures",
    "load_structures": "structures",
}

__all__ = [
    "Builder",
    "Diagram",
    "Draft",
    "Filter",
    "Fixed",
    "Float",
    "Form",
    "Preset",
    "Realization",
    "Size",
    "decompositions",
    "design",
    "forms",
    "kinds",
    "load_preset",
    "load_structures",
    "measure",
    "minus",
    "realize",
]


def __getattr__(name: str) -> object:
    """Names are imported when they are first used: `streamhost --help` needs none of them."""
    if name == "measure":
        return import_module("streamhost.measure")
    if name in _HOMES:
        return getattr(import_module(f"streamhost.{_HOMES[name]}"), name)
    raise AttributeError(f"module 'streamhost' has no attribute {name!r}")


def __dir__() -> list[str]:
    return sorted(__all__)
