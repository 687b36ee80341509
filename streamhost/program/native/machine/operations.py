"""The operations that generated text may use, each as the machine has it. None of them can raise.

No flag allows a float operation to be contracted or re-associated; integers wrap.
"""

import ast
from collections.abc import Callable
from functools import reduce
from typing import Any

from llvmlite import ir

from streamhost.program.native.machine.kinds import KINDS, Kind, Value, alike, converted, lanes_of, same, shaped, spread

Operation = Callable[..., Value]

INTEGER = {ast.Add: "add", ast.Sub: "sub", ast.Mult: "mul", ast.BitAnd: "and_", ast.BitOr: "or_", ast.BitXor: "xor"}
FLOAT = {ast.Add: "fadd", ast.Sub: "fsub", ast.Mult: "fmul"}
COMPARED = {ast.Eq: "==", ast.NotEq: "!=", ast.Lt: "<", ast.LtE: "<=", ast.Gt: ">", ast.GtE: ">="}


def binary(builder: Any, operator: ast.operator, first: Value, second: Value) -> Value:
    """+ - * & | ^ of two alike, shifts by an int64, % of what is not negative."""
    if isinstance(operator, ast.LShift | ast.RShift):
        return _shifted(builder, operator, first, second)
    first, second = alike(builder, first, second)
    kind = same(first, second)
    if isinstance(operator, ast.Mod):
        return Value(kind, builder.srem(first.machine, second.machine))
    names = FLOAT if kind.is_float else INTEGER
    return Value(kind, getattr(builder, names[type(operator)])(first.machine, second.machine))


def _shifted(builder: Any, operator: ast.operator, value: Value, count: Value) -> Value:
    by = spread(builder, converted(builder, count, value.kind), lanes_of(value)).machine
    if isinstance(operator, ast.LShift):
        return Value(value.kind, builder.shl(value.machine, by))
    right = builder.lshr if value.kind.unsigned else builder.ashr
    return Value(value.kind, right(value.machine, by))


def negated(builder: Any, value: Value) -> Value:
    """The sign of a float turned, of zero too; an integer's two's complement."""
    if value.kind.is_float:
        return Value(value.kind, builder.fneg(value.machine))
    return Value(value.kind, builder.neg(value.machine))


def compared(builder: Any, operator: ast.cmpop, first: Value, second: Value) -> Value:
    """A bool. A comparison with NaN is false, but for !=, which is true."""
    first, second = alike(builder, first, second)
    kind, sign = same(first, second), COMPARED[type(operator)]
    if kind.is_float:
        compare = builder.fcmp_unordered if sign == "!=" else builder.fcmp_ordered
    else:
        compare = builder.icmp_unsigned if kind.unsigned else builder.icmp_signed
    return Value(KINDS["bool"], compare(sign, first.machine, second.machine))


def chosen(builder: Any, condition: Value, first: Value, second: Value) -> Value:
    """The first where the condition holds, else the second; both have been evaluated."""
    condition, first, second = alike(builder, condition, first, second)
    kind = same(first, second)
    return Value(kind, builder.select(condition.machine, first.machine, second.machine))


def _least(builder: Any, first: Value, second: Value) -> Value:
    return chosen(builder, compared(builder, ast.Lt(), second, first), second, first)


def _most(builder: Any, first: Value, second: Value) -> Value:
    return chosen(builder, compared(builder, ast.Gt(), second, first), second, first)


def _machine(name: str) -> Operation:
    """An operation that LLVM has for every float type, of one lane or several."""

    def operation(builder: Any, *values: Value) -> Value:
        values = alike(builder, *values)
        kind, lanes = same(*values), lanes_of(values[0])
        shape = shaped(kind, lanes)
        full = f"llvm.{name}.{'' if lanes == 1 else f'v{lanes}'}{'f32' if kind.name == 'float32' else 'f64'}"
        function = builder.module.globals.get(full)
        if function is None:
            function = ir.Function(builder.module, ir.FunctionType(shape, [shape] * len(values)), full)
        return Value(kind, builder.call(function, [value.machine for value in values]))

    return operation


def _is_finite(builder: Any, value: Value) -> Value:
    infinite = Value(value.kind, ir.Constant(value.kind.type, float("inf")))
    return compared(builder, ast.Lt(), _machine("fabs")(builder, value), infinite)


def _clamped(builder: Any, value: Value, low: Value, high: Value) -> Value:
    """A wide integer brought into a range of int64, as one."""
    wide = KINDS["wide"]
    limited = _least(builder, _most(builder, value, converted(builder, low, wide)), converted(builder, high, wide))
    return converted(builder, limited, KINDS["int64"])


def _differs(builder: Any, first: Value, second: Value) -> Value:
    return converted(builder, compared(builder, ast.NotEq(), first, second), KINDS["int64"])


def _short(builder: Any, value: Value) -> Value:
    """An int64 of which the printer knows that it fits 32 bits: said to LLVM where vectors multiply such much faster."""
    if lanes_of(value) == 1:
        return value
    return converted(builder, converted(builder, value, KINDS["int32"]), value.kind)


def _total(builder: Any, value: Value) -> Value:
    """The sum of all lanes."""
    if lanes_of(value) == 1:
        return value
    entries = [builder.extract_element(value.machine, ir.Constant(ir.IntType(32), k)) for k in range(lanes_of(value))]
    return Value(value.kind, reduce(builder.add, entries))


def _conversion(kind: Kind) -> Operation:
    return lambda builder, value: converted(builder, value, kind)


CALLS: dict[str, Operation] = {
    "min": _least,
    "max": _most,
    "abs": _machine("fabs"),
    "fma": _machine("fma"),
    "np.rint": _machine("rint"),
    "np.floor": _machine("floor"),
    "np.trunc": _machine("trunc"),
    "np.isfinite": _is_finite,
    "wide": _conversion(KINDS["wide"]),
    "narrow": _conversion(KINDS["int64"]),
    "clamp": _clamped,
    "differs": _differs,
    "short": _short,
    "total": _total,
    **{f"np.{name}": _conversion(KINDS[name]) for name in ("int64", "uint64", "uint8", "float32", "float64")},
}
