"""Values of generated text as LLVM has them: their kinds, how one becomes another, and values of several lanes at once.

A value that differs from lane to lane is an LLVM vector with an entry a lane; one that is the same in all stays one.
"""

from dataclasses import dataclass
from typing import Any

from llvmlite import ir

BOOL = ir.IntType(1)
BYTE = ir.IntType(8)
I64 = ir.IntType(64)
WIDE = ir.IntType(128)
F32 = ir.FloatType()
F64 = ir.DoubleType()


@dataclass(frozen=True)
class Kind:
    """What a value is: its LLVM type, and whether an integer has no sign."""

    name: str
    type: Any
    unsigned: bool = False

    @property
    def is_float(self) -> bool:
        return self.name in ("float32", "float64")


KINDS = {
    kind.name: kind
    for kind in (
        Kind("bool", BOOL, unsigned=True),
        Kind("uint8", BYTE, unsigned=True),
        Kind("int32", ir.IntType(32)),
        Kind("int64", I64),
        Kind("uint64", I64, unsigned=True),
        Kind("wide", WIDE),
        Kind("float32", F32),
        Kind("float64", F64),
    )
}


@dataclass(frozen=True)
class Value:
    """A machine value of a kind."""

    kind: Kind
    machine: Any


Values = Value | tuple["Values", ...]
"""One value, or as many as a pair or tuple of the text holds."""


def constant(number: int | float) -> Value:
    """A number as it stands in the text: float64, or int64, or uint64 where it needs 64 bits."""
    if isinstance(number, float):
        return Value(KINDS["float64"], ir.Constant(F64, number))
    kind = KINDS["int64"] if number < 1 << 63 else KINDS["uint64"]
    return Value(kind, ir.Constant(I64, int(number)))


def lanes_of(value: Value) -> int:
    """Entries of a value; 1 of what is the same in all lanes."""
    return value.machine.type.count if isinstance(value.machine.type, ir.VectorType) else 1


def shaped(kind: Kind, lanes: int) -> Any:
    """The LLVM type of so many values of a kind."""
    return kind.type if lanes == 1 else ir.VectorType(kind.type, lanes)


def spread(builder: Any, value: Value, lanes: int) -> Value:
    """A value in so many lanes: the same in all, where it was one."""
    if lanes_of(value) == lanes:
        return value
    shape = shaped(value.kind, lanes)
    if isinstance(value.machine, ir.Constant):
        return Value(value.kind, ir.Constant(shape, [value.machine.constant] * lanes))
    first = builder.insert_element(ir.Constant(shape, ir.Undefined), value.machine, ir.Constant(ir.IntType(32), 0))
    zeros = ir.Constant(ir.VectorType(ir.IntType(32), lanes), [0] * lanes)
    return Value(value.kind, builder.shuffle_vector(first, ir.Constant(shape, ir.Undefined), zeros))


def alike(builder: Any, *values: Value) -> tuple[Value, ...]:
    """Operands with as many lanes as the one that has most."""
    lanes = max(map(lanes_of, values))
    return tuple(spread(builder, value, lanes) for value in values)


def converted(builder: Any, value: Value, kind: Kind) -> Value:
    """A value as another kind, as a conversion in the text says: integers wrap, floats are rounded to nearest even.

    A float becomes an integer by cutting its fraction off; one that does not fit is the printer's mistake.
    """
    source, machine, shape = value.kind, value.machine, shaped(kind, lanes_of(value))
    if source == kind:
        return value
    if source.is_float and kind.is_float:
        machine = (builder.fpext if kind.name == "float64" else builder.fptrunc)(machine, shape)
    elif source.is_float:
        machine = builder.fptosi(machine, shape)
    elif kind.is_float:
        machine = (builder.uitofp if source.unsigned else builder.sitofp)(machine, shape)
    elif source.type.width < kind.type.width:
        machine = (builder.zext if source.unsigned else builder.sext)(machine, shape)
    elif source.type.width > kind.type.width:
        machine = builder.trunc(machine, shape)
    return Value(kind, machine)


def same(*values: Value) -> Kind:
    """The kind of operands, which the printer has made alike."""
    kind = values[0].kind
    assert all(value.kind == kind for value in values), "operands of several kinds"
    return kind
