"""Floating-point arithmetic: IEEE 754 binary32 and binary64."""

from dataclasses import dataclass

from streamhost.errors import FormatError, nearest

FLOAT_TYPES = ("float32", "float64")


@dataclass(frozen=True)
class Float:
    """A floating-point format: one type at all eight places, or float32 with a float64 accumulator.

    `fused`: every product after the first term of a sum is added by one fused multiply-add, in the drawn order.
    `flush_subnormals`: a subnormal value that a delay stores becomes 0. Rounding is to nearest, ties to even.
    Raises FormatError for an unknown type.
    """

    type: str = "float64"
    accumulator: str | None = None
    fused: bool = False
    flush_subnormals: bool = False

    def __post_init__(self) -> None:
        if self.type not in FLOAT_TYPES:
            raise FormatError(f'type = {self.type!r} is no floating-point type: "float32" or "float64".'
                              + nearest(str(self.type), FLOAT_TYPES))
        if self.accumulator not in (None, self.type, "float64"):
            raise FormatError(f'accumulator = {self.accumulator!r} cannot stand over {self.type}: it is left out, '
                              f'"{self.type}" or "float64".')

    @property
    def sum_type(self) -> str:
        """The type in which sums are made."""
        return self.accumulator or self.type

    @property
    def label(self) -> str:
        """A short name for tables."""
        wide = " sums float64" if self.sum_type != self.type else ""
        return f"{self.type}{'-fused' if self.fused else ''}{wide}{' flushed' if self.flush_subnormals else ''}"
