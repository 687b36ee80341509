"""The instrument `overflow`: how full registers can become, and what happens when one overflows."""

from streamhost.measure.overflows.overflow_run import overflow
from streamhost.measure.overflows.result import Overflow, Recovery, Register

__all__ = ["Overflow", "Recovery", "Register", "overflow"]
