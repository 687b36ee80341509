"""The block engine: lanes that run realizations, driven block by block through one compiled step.

A file drives it in `rendering`. The step allocates nothing, locks nothing and cannot raise, so that a sound card can
drive the very same machine code, and what is heard is bit for bit what is rendered.
"""

from streamhost.host.engine import BLOCK, Device, Host
from streamhost.host.guard import Guard
from streamhost.host.lane import Lane
from streamhost.host.meters import Meters
from streamhost.host.plan import Change, Changed

__all__ = ["BLOCK", "Change", "Changed", "Device", "Guard", "Host", "Lane", "Meters"]
