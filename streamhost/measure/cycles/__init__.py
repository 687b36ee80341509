"""Limit cycles: what goes on by itself when a signal has ended, or stays away from its final value."""

from streamhost.measure.cycles.instrument import limit_cycles
from streamhost.measure.cycles.results import Cycle, Ended, LimitCycles, SectionCycles, Stall

__all__ = ["Cycle", "Ended", "LimitCycles", "SectionCycles", "Stall", "limit_cycles"]
