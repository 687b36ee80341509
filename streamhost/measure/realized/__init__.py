"""The instrument `response`: what rounding the coefficients did."""

from streamhost.measure.realized.realized_response import response
from streamhost.measure.realized.result import BandDeviation, Response

__all__ = ["BandDeviation", "Response", "response"]
