"""Preset files: what a realization is, stated as data. Opening one never runs code."""

from streamhost.presets.preset import Preset
from streamhost.presets.reading import load_preset, parse_preset
from streamhost.presets.varying import vary

__all__ = ["Preset", "load_preset", "parse_preset", "vary"]
