"""Addresses as the compiled step uses them, a kernel called by its address, ordered loads and stores, and the clock."""
# mypy: disallow-untyped-decorators=False

import sys
from typing import Any

from llvmlite import ir
from numba import types
from numba.core import cgutils
from numba.extending import intrinsic

BYTES = ir.IntType(8).as_pointer()
WORD = ir.IntType(64)
KERNEL = ir.FunctionType(ir.VoidType(), [BYTES] * 8 + [WORD] * 3)
PART = ir.FunctionType(WORD, [WORD] * 4)

MONOTONIC = {"linux": 1, "darwin": 6}.get(sys.platform)
"""What the system's headers number its steady clock with; None where there is no `clock_gettime`."""


@intrinsic
def record(typingctx: Any, address: Any, kind: Any) -> Any:
    """The record of a numpy dtype at an address, to be read and written by the names of its fields."""

    def view(context: Any, builder: Any, signature: Any, args: Any) -> Any:
        return builder.inttoptr(args[0], context.get_value_type(signature.return_type))

    return kind.dtype(types.int64, kind), view


def _element(machine: Any, kind: Any) -> tuple[Any, Any]:
    """Load and store of the i-th element of an array at an address."""

    def place(builder: Any, args: Any) -> Any:
        return builder.gep(builder.inttoptr(args[0], machine.as_pointer()), [args[1]])

    @intrinsic
    def load(typingctx: Any, address: Any, index: Any) -> Any:
        def generate(context: Any, builder: Any, signature: Any, args: Any) -> Any:
            return builder.load(place(builder, args))

        return kind(types.int64, types.int64), generate

    @intrinsic
    def store(typingctx: Any, address: Any, index: Any, value: Any) -> Any:
        def generate(context: Any, builder: Any, signature: Any, args: Any) -> Any:
            builder.store(args[2], place(builder, args))
            return context.get_dummy_value()

        return types.void(types.int64, types.int64, kind), generate

    return load, store


real, set_real = _element(ir.DoubleType(), types.float64)
single, set_single = _element(ir.FloatType(), types.float32)
word, set_word = _element(WORD, types.int64)
byte, set_byte = _element(ir.IntType(8), types.uint8)


@intrinsic
def address_of(typingctx: Any, given: Any) -> Any:
    """The address that a pointer holds."""
    return types.int64(types.voidptr), lambda context, builder, signature, args: builder.ptrtoint(args[0], WORD)


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
    """Call the kernel at an address; its arrays are given by their addresses."""

    def call(context: Any, builder: Any, signature: Any, args: Any) -> Any:
        function = builder.inttoptr(args[0], KERNEL.as_pointer())
        arrays = [builder.inttoptr(address, BYTES) for address in args[1:9]]
        builder.call(function, [*arrays, *args[9:]])
        return context.get_dummy_value()

    return types.void(*([types.int64] * 12)), call


@intrinsic
def call_part(typingctx: Any, part: Any, host: Any, a: Any, b: Any, c: Any) -> Any:
    """Call a part of the step at an address."""

    def call(context: Any, builder: Any, signature: Any, args: Any) -> Any:
        return builder.call(builder.inttoptr(args[0], PART.as_pointer()), args[1:])

    return types.int64(*([types.int64] * 5)), call


@intrinsic
def load_acquire(typingctx: Any, address: Any) -> Any:
    """The 64-bit word at an address; what was stored before it was released is seen after it."""

    def load(context: Any, builder: Any, signature: Any, args: Any) -> Any:
        return builder.load_atomic(builder.inttoptr(args[0], WORD.as_pointer()), "acquire", 8)

    return types.int64(types.int64), load


@intrinsic
def store_release(typingctx: Any, address: Any, value: Any) -> Any:
    """Store a 64-bit word at an address, after all that was stored before it."""

    def store(context: Any, builder: Any, signature: Any, args: Any) -> Any:
        builder.store_atomic(args[1], builder.inttoptr(args[0], WORD.as_pointer()), "release", 8)
        return context.get_dummy_value()

    return types.void(types.int64, types.int64), store


@intrinsic
def nanoseconds(typingctx: Any) -> Any:
    """The steady clock; 0 where the system has none that is called by name."""

    def read(context: Any, builder: Any, signature: Any, args: Any) -> Any:
        if MONOTONIC is None:
            return ir.Constant(WORD, 0)
        now = cgutils.alloca_once(builder, ir.ArrayType(WORD, 2))
        kind = ir.FunctionType(ir.IntType(32), [ir.IntType(32), BYTES])
        function = cgutils.get_or_insert_function(builder.module, kind, "clock_gettime")
        builder.call(function, [ir.Constant(ir.IntType(32), MONOTONIC), builder.bitcast(now, BYTES)])
        seconds, rest = builder.extract_value(builder.load(now), 0), builder.extract_value(builder.load(now), 1)
        return builder.add(builder.mul(seconds, ir.Constant(WORD, 1_000_000_000)), rest)

    return types.int64(), read
