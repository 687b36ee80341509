"""Values of generated text as LLVM has them: their kinds, and how one becomes another."""

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


def converted(builder: Any, value: Value, kind: Kind) -> Value:
    """A value as another kind, as a conversion in the text says: integers wrap, floats are rounded to nearest even.

    A float becomes an integer by cutting its fraction off; one that does not fit is the printer's mistake.
    """
    source, target = value.kind, kind
    if source == target:
        return value
    machine = value.machine
    if source.is_float and target.is_float:
        machine = builder.fpext(machine, F64) if target.name == "float64" else builder.fptrunc(machine, F32)
    elif source.is_float:
        machine = builder.fptosi(machine, target.type)
    elif target.is_float:
        machine = (builder.uitofp if source.unsigned else builder.sitofp)(machine, target.type)
    elif source.type.width < target.type.width:
        machine = (builder.zext if source.unsigned else builder.sext)(machine, target.type)
    elif source.type.width > target.type.width:
        machine = builder.trunc(machine, target.type)
    return Value(kind, machine)


def same(first: Value, second: Value) -> Kind:
    """The kind of two operands, which the printer has made alike."""
    assert first.kind == second.kind, f"{first.kind.name} beside {second.kind.name}"
    return first.kind
