"""Addresses as the compiled step uses them: a number as a pointer, and a kernel called by its address."""
# mypy: disallow-untyped-decorators=False

from typing import Any

from llvmlite import ir
from numba import types
from numba.extending import intrinsic

BYTES = ir.IntType(8).as_pointer()
COUNT = ir.IntType(64)
KERNEL = ir.FunctionType(ir.VoidType(), [BYTES] * 8 + [COUNT] * 3)


@intrinsic
def pointer(typingctx: Any, address: Any) -> Any:
    """The pointer to an address."""
    return types.voidptr(types.int64), lambda context, builder, signature, args: builder.inttoptr(args[0], BYTES)


@intrinsic
def call_kernel(
    typingctx: Any,
    kernel: Any,
    x: Any,
    y: Any,
    state: Any,
    coefficients: Any,
    keys: Any,
    meters: Any,
    marks: Any,
    trace: Any,
    frames: Any,
    channels: Any,
    frame0: Any,
) -> Any:
    """Call the kernel at an address; its arrays are given by their addresses, x by a pointer."""

    def call(context: Any, builder: Any, signature: Any, args: Any) -> Any:
        function = builder.inttoptr(args[0], KERNEL.as_pointer())
        arrays = [args[1], *(builder.inttoptr(address, BYTES) for address in args[2:9])]
        builder.call(function, [*arrays, *args[9:]])
        return context.get_dummy_value()

    return types.void(types.int64, types.voidptr, *([types.int64] * 10)), call
