"""Standard curves: analogue networks, their plain bilinear transforms, their fits, and the limits of the standards."""

from streamhost.filters.curves.kinds import KINDS

__all__ = ["KINDS"]
