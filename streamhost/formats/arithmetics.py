"""Arithmetics named by their property: length of what is multiplied x coefficient length + accumulator length.

Registers round half-up and saturate, accumulators wrap unless said. Keys are those of a preset's [format]; what a
user states beside `arithmetic` overrides them.
"""

from collections.abc import Mapping

ARITHMETICS: Mapping[str, Mapping[str, object]] = {
    "16x16+40": {"signal": "Q1.15", "coefficients": {"bits": 16}, "accumulator": 40},
    # The saturating 32-bit accumulator with products doubled on entry, as ITU-T G.191's basic operators have it.
    "16x16-32": {"signal": "Q1.15", "coefficients": {"bits": 16},
                 "accumulator": {"bits": 32, "drop": -1, "overflow": "saturate"}},
    "32x16-high": {"signal": "Q1.31", "coefficients": {"bits": 16}, "accumulator": {"bits": 32, "drop": 16}},
    "32x32-high": {"signal": "Q1.31", "coefficients": {"bits": 32}, "accumulator": {"bits": 32, "drop": 32}},
    "24x24+56": {"signal": "Q1.23", "coefficients": {"bits": 24}, "accumulator": 56},
    "48x24+56": {"signal": "Q1.23", "coefficients": {"bits": 24}, "state": "Q1.47", "operand": "Q1.47",
                 "accumulator": "Q9.47"},
    "32x32+64": {"signal": "Q1.31", "coefficients": {"bits": 32}, "accumulator": 64},
}
