"""What a realization costs: counted on its program, bounded by its loops, timed on this machine, estimated for another.

The only part that measures time for its own sake; `measure` tells what a realization does to sound.
"""

from streamhost.profile.cores import Core, Estimate, estimate, load_core, parse_core
from streamhost.profile.operations import Work, work
from streamhost.profile.profiling import bounds_of, profile
from streamhost.profile.result import BlockTime, Bounds, Method, Profile, Profiled, TailTime, Timing

__all__ = [
    "BlockTime", "Bounds", "Core", "Estimate", "Method", "Profile", "Profiled", "TailTime", "Timing", "Work", "bounds_of",
    "estimate", "load_core", "parse_core", "profile", "work",
]
