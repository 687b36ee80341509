"""Machine operations that generated kernels use and Numba has no words for: 128-bit integers and fused multiply-add.

A `Wide` is a signed 128-bit integer (two 64-bit words). Arithmetic on it wraps, as on the machine.
"""

import operator
from typing import Any

from llvmlite import ir
from numba import types
from numba.core.datamodel import PrimitiveModel
from numba.extending import intrinsic, overload, register_model

INTRINSICS_VERSION = 1
I128 = ir.IntType(128)
I64 = ir.IntType(64)


class WideType(types.Type):
    """The Numba type of a 128-bit integer."""

    def __init__(self) -> None:
        super().__init__(name="Wide")


wide_type = WideType()


@register_model(WideType)
class WideModel(PrimitiveModel):
    """Held as one 128-bit LLVM integer."""

    def __init__(self, manager: Any, kind: Any) -> None:
        super().__init__(manager, kind, I128)


@intrinsic
def wide(typingctx: Any, value: Any) -> Any:
    """A 64-bit integer as a Wide."""
    if value is wide_type:
        return wide_type(wide_type), lambda context, builder, signature, args: args[0]

    def convert(context: Any, builder: Any, signature: Any, args: Any) -> Any:
        code = context.cast(builder, args[0], signature.args[0], types.int64)
        return builder.sext(code, I128)

    return wide_type(value), convert


@intrinsic
def narrow(typingctx: Any, value: Any) -> Any:
    """The low 64 bits of a Wide."""
    return types.int64(wide_type), lambda context, builder, signature, args: builder.trunc(args[0], I64)


@intrinsic
def clamp(typingctx: Any, value: Any, low: Any, high: Any) -> Any:
    """A Wide brought into the 64-bit range low .. high, as a 64-bit integer."""

    def limit(context: Any, builder: Any, signature: Any, args: Any) -> Any:
        low_wide, high_wide = (builder.sext(arg, I128) for arg in args[1:])
        floor = builder.select(builder.icmp_signed("<", args[0], low_wide), low_wide, args[0])
        return builder.trunc(builder.select(builder.icmp_signed(">", floor, high_wide), high_wide, floor), I64)

    return types.int64(wide_type, types.int64, types.int64), limit


@intrinsic
def differs(typingctx: Any, first: Any, second: Any) -> Any:
    """1 where two Wides differ, else 0."""

    def compare(context: Any, builder: Any, signature: Any, args: Any) -> Any:
        return builder.zext(builder.icmp_signed("!=", *args), I64)

    return types.int64(wide_type, wide_type), compare


def _binary(name: str) -> Any:
    @intrinsic
    def operation(typingctx: Any, first: Any, second: Any) -> Any:
        return wide_type(wide_type, wide_type), lambda context, builder, signature, args: getattr(builder, name)(*args)

    return operation


def _shift(name: str) -> Any:
    @intrinsic
    def operation(typingctx: Any, value: Any, count: Any) -> Any:
        def shift(context: Any, builder: Any, signature: Any, args: Any) -> Any:
            return getattr(builder, name)(args[0], builder.sext(args[1], I128))

        return wide_type(wide_type, types.int64), shift

    return operation


_add, _sub, _mul, _and = (_binary(name) for name in ("add", "sub", "mul", "and_"))
_left, _right = _shift("shl"), _shift("ashr")


def _register(symbol: Any, operation: Any, second: Any) -> None:
    @overload(symbol)
    def typed(a, b):  # numba compares this signature with the implementation's
        if a is wide_type and (b is wide_type if second is wide_type else isinstance(b, types.Integer)):
            return lambda a, b: operation(a, b)
        return None


for _symbol, _operation, _second in (
    (operator.add, _add, wide_type), (operator.sub, _sub, wide_type), (operator.mul, _mul, wide_type),
    (operator.and_, _and, wide_type), (operator.lshift, _left, types.int64), (operator.rshift, _right, types.int64),
):
    _register(_symbol, _operation, _second)


@intrinsic
def fma(typingctx: Any, a: Any, b: Any, c: Any) -> Any:
    """a * b + c, rounded once, in the type of its arguments."""
    return c(c, c, c), lambda context, builder, signature, args: builder.fma(*args)
