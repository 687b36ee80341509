"""The operations of generated text, each against numpy or Python's own integers."""

from collections.abc import Callable

import numpy as np
import pytest
from hypothesis import example, given
from hypothesis import strategies as st
from numpy.typing import NDArray

from streamhost.cache import load_module
from streamhost.program.native.frame import close_text, open_text
from streamhost.program.native.kernel import SIGNATURE
from streamhost.program.native.text import Text

Integers, Floats = NDArray[np.int64], NDArray[np.float64]
Call = Callable[[Integers, Floats, Integers, Floats], None]

INTEGER: dict[str, Callable[[int, int], int]] = {
    "a + b": lambda a, b: a + b,
    "a - b": lambda a, b: a - b,
    "a * b": lambda a, b: a * b,
    "a & b": lambda a, b: a & b,
    "a | b": lambda a, b: a | b,
    "a ^ b": lambda a, b: a ^ b,
    "-a": lambda a, b: -a,
    "a >> 5": lambda a, b: a >> 5,
    "a << 7": lambda a, b: a << 7,
    "min(a, b)": min,
    "max(a, b)": max,
    "np.int64(a < b)": lambda a, b: int(a < b),
    "np.int64(a >= b)": lambda a, b: int(a >= b),
    "a if a == b else -9223372036854775808": lambda a, b: a if a == b else -(2**63),
    "np.int64(np.uint64(a) >> np.uint64(9))": lambda a, b: (a % 2**64) >> 9,
    "narrow((wide(a) * wide(b)) >> 64)": lambda a, b: (a * b) >> 64,
    "clamp(wide(a) + wide(b), -9223372036854775808, 9223372036854775807)": lambda a, b: max(-(2**63), min(a + b, 2**63 - 1)),
    "differs(wide(a), wide(b))": lambda a, b: int(a != b),
    "twice(a)": lambda a, b: 2 * a,
    "pair(a, b)[1]": lambda a, b: a - b,
}
FLOAT: dict[str, Callable[[np.float64, np.float64], np.float64]] = {
    "x + y": np.add,
    "x - y": np.subtract,
    "x * y": np.multiply,
    "-x": lambda x, y: -x,
    "np.float64(np.float32(x))": lambda x, y: np.float64(np.float32(x)),
    "np.rint(x)": lambda x, y: np.rint(x),
    "np.floor(x)": lambda x, y: np.floor(x),
    "np.trunc(x)": lambda x, y: np.trunc(x),
    "abs(x)": lambda x, y: np.abs(x),
    "np.float64(x != x)": lambda x, y: np.float64(np.isnan(x)),
    "np.float64(x < y)": lambda x, y: np.float64(x < y),
    "np.float64(np.isfinite(x))": lambda x, y: np.float64(np.isfinite(x)),
    "0.0 if x != x else x": lambda x, y: np.float64(0.0) if np.isnan(x) else x,
}
FUNCTIONS = """
def twice(a):
    b = a + a
    return b


def pair(a, b):
    b = a - b
    return a, b
"""


@pytest.fixture(scope="module")
def kernel() -> Call:
    text = Text()
    open_text(text, "Every operation.", FUNCTIONS.strip())
    for name, address, count, kind in (("A", "x_", 2, "int64"), ("X", "y_", 2, "float64"),
                                       ("I", "state_", len(INTEGER), "int64"), ("F", "trace_", len(FLOAT), "float64")):
        text(f"{name} = carray({address}, ({count},), np.{kind})")
    for name, place in (("a", "A[0]"), ("b", "A[1]"), ("x", "X[0]"), ("y", "X[1]")):
        text(f"{name} = {place}")
    for k, expression in enumerate(INTEGER):
        text(f"I[{k}] = {expression}")
    for k, expression in enumerate(FLOAT):
        text(f"F[{k}] = {expression}")
    text.depth = 0
    close_text(text)
    module = load_module(str(text), "every operation")

    def call(a: Integers, x: Floats, integers: Integers, floats: Floats) -> None:
        first, last = (array.ctypes.data for array in (a, x, integers)), floats.ctypes.data
        SIGNATURE(module.kernel.address)(*first, *[None] * 4, last, 0, 0, 0)

    return call


CODES = st.one_of(st.integers(-(2**63), 2**63 - 1), st.integers(-4, 4))


@given(CODES, CODES, st.floats(), st.floats())
@example(-(2**63), 2**63 - 1, 0.5, -0.0)
@example(3, 3, 2.5, float("nan"))
def test_every_operation(kernel: Call, a: int, b: int, x: float, y: float) -> None:
    integers, floats = np.zeros(len(INTEGER), np.int64), np.zeros(len(FLOAT))
    kernel(np.array([a, b]), np.array([x, y]), integers, floats)
    for (expression, function), found in zip(INTEGER.items(), integers, strict=True):
        assert int(found) == (function(a, b) + 2**63) % 2**64 - 2**63, expression
    with np.errstate(all="ignore"):
        expected = np.array([function(np.float64(x), np.float64(y)) for function in FLOAT.values()])
    np.testing.assert_array_equal(floats, expected)  # NaN equals NaN
    np.testing.assert_array_equal(np.signbit(floats)[~np.isnan(expected)], np.signbit(expected)[~np.isnan(expected)])
