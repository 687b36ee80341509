"""The instrument `response`: what rounding the coefficients did."""

from streamhost.measure.realized.realized_response import response
from streamhost.measure.realized.result import (
    BandDeviation,
    MaskMargin,
    OutputResponse,
    Response,
    Root,
    Stability,
    Step,
)

__all__ = ["BandDeviation", "MaskMargin", "OutputResponse", "Response", "Root", "Stability", "Step", "response"]
