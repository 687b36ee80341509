"""Words, roundings and overflows; the places of a format; shipped arithmetics."""

from streamhost.errors import FormatError, nearest
from streamhost.formats.arithmetics import ARITHMETICS
from streamhost.formats.fixed import Fixed
from streamhost.formats.floats import Float
from streamhost.formats.rules import AccumulatorRule, CoefficientRule, ProductRule
from streamhost.formats.words import OVERFLOWS, ROUNDINGS, Quantizer, Word, parse_word

Format = Fixed | Float

FLOATS = {
    "float32": Float("float32"),
    "float32-fused": Float("float32", fused=True),
    "float64": Float("float64"),
}


def named_format(name: str) -> Format:
    """The shipped arithmetic of that name; raises FormatError that lists them all."""
    if name in FLOATS:
        return FLOATS[name]
    if name in ARITHMETICS:
        return Fixed(arithmetic=name)
    names = (*FLOATS, *ARITHMETICS)
    raise FormatError(f'There is no arithmetic "{name}": {", ".join(names)}.{nearest(name, names)} '
                      f'Any other is stated as Fixed("Q1.15", ...).')


__all__ = [
    "ARITHMETICS", "FLOATS", "OVERFLOWS", "ROUNDINGS", "AccumulatorRule", "CoefficientRule", "Fixed", "Float", "Format",
    "FormatError", "ProductRule", "Quantizer", "Word", "named_format", "parse_word",
]
