"""What is wanted: transfer functions, and designs that make them from parameters."""

from streamhost.filters.designs import design, kinds
from streamhost.filters.factors import Codes, Polynomials, ZerosPoles
from streamhost.filters.filter import Filter

__all__ = ["Codes", "Filter", "Polynomials", "ZerosPoles", "design", "kinds"]
