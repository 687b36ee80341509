"""What is wanted: transfer functions, and designs that make them from parameters."""

from streamhost.filters.curve_fit import Fit, curve_fit
from streamhost.filters.designs import design, kinds
from streamhost.filters.factors import Codes, Polynomials, ZerosPoles
from streamhost.filters.filter import Filter

__all__ = ["Codes", "Filter", "Fit", "Polynomials", "ZerosPoles", "curve_fit", "design", "kinds"]
