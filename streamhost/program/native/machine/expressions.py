"""Expressions of generated text as machine values."""

import ast
from collections.abc import Mapping
from typing import Any, Protocol

from streamhost.program.native.machine.kinds import KINDS, Value, Values, constant, converted
from streamhost.program.native.machine.memory import Array, Place, load
from streamhost.program.native.machine.operations import CALLS, binary, chosen, compared, negated

LANE = "c"
"""The variable of the loop that may go over several lanes at once."""


class Scope(Protocol):
    """What names mean at a place of the text, and over how many lanes the present loop goes at once."""

    builder: Any
    lanes: int

    @property
    def arrays(self) -> Mapping[str, Array]:
        """The arrays of the text by name."""
        ...

    @property
    def functions(self) -> Mapping[str, ast.FunctionDef]:
        """The functions that the text may call."""
        ...

    def read(self, name: str) -> Values:
        """The value that a name has now."""
        ...


class InlineScope:
    """The names of a function of the text whose body stands in place of its call: each new value is a new one."""

    def __init__(self, outer: Scope, names: dict[str, Values]) -> None:
        self.builder, self.lanes = outer.builder, outer.lanes
        self.arrays, self.functions = outer.arrays, outer.functions
        self.names = names

    def read(self, name: str) -> Values:
        return self.names[name]


def evaluated(scope: Scope, node: ast.expr) -> Values:
    """An expression's value; a pair has as many as it has entries."""
    if isinstance(node, ast.Tuple):
        return tuple(evaluated(scope, entry) for entry in node.elts)
    if isinstance(node, ast.Name):
        return scope.read(node.id)
    if isinstance(node, ast.IfExp):
        condition = scalar(scope, node.test)
        return _chosen(scope.builder, condition, evaluated(scope, node.body), evaluated(scope, node.orelse))
    if isinstance(node, ast.Call) and called(node) in scope.functions:
        return _inlined(scope, node)
    if isinstance(node, ast.Subscript) and not _is_array(scope, node):
        entries = evaluated(scope, node.value)
        assert isinstance(entries, tuple), "a pair has entries"
        return entries[int(_number(node.slice))]
    return scalar(scope, node)


def scalar(scope: Scope, node: ast.expr) -> Value:
    """An expression's one value."""
    builder = scope.builder
    if isinstance(node, ast.Constant):
        return constant(_number(node))
    if isinstance(node, ast.UnaryOp) and isinstance(node.op, ast.USub):
        if isinstance(node.operand, ast.Constant):
            return constant(-_number(node.operand))
        return negated(builder, scalar(scope, node.operand))
    if isinstance(node, ast.BinOp):
        return binary(builder, node.op, scalar(scope, node.left), scalar(scope, node.right))
    if isinstance(node, ast.Compare):
        return compared(builder, node.ops[0], scalar(scope, node.left), scalar(scope, node.comparators[0]))
    if isinstance(node, ast.Subscript) and _is_array(scope, node):
        return load(builder, place(scope, node))
    if isinstance(node, ast.Call) and called(node) in CALLS:
        return CALLS[called(node)](builder, *(scalar(scope, argument) for argument in node.args))
    value = evaluated(scope, node)
    assert isinstance(value, Value), f"one value: {ast.unparse(node)}"
    return value


def place(scope: Scope, node: ast.Subscript) -> Place:
    """Where an array's entry lies, or, of several lanes, the entry of the first and the distance to the next."""
    assert isinstance(node.value, ast.Name), "arrays have names"
    array, builder = scope.arrays[node.value.id], scope.builder
    indices = node.slice.elts if isinstance(node.slice, ast.Tuple) else [node.slice]
    offset = converted(builder, scalar(scope, indices[0]), KINDS["int64"]).machine
    for length, index in zip(array.lengths, indices[1:], strict=True):
        offset = builder.add(builder.mul(offset, length.machine), scalar(scope, index).machine)
    lane = next((k for k, index in enumerate(indices) if scope.lanes > 1 and LANE in names(index)), None)
    step = None
    if lane is not None:
        step = constant(1)
        for length in array.lengths[lane:]:
            step = Value(length.kind, builder.mul(step.machine, length.machine))
    return Place(array.kind, array.pointer, offset, scope.lanes if lane is not None else 1, step)


def names(node: ast.AST) -> set[str]:
    """All names in a part of the text."""
    return {each.id for each in ast.walk(node) if isinstance(each, ast.Name)}


def _number(node: ast.expr) -> int | float:
    assert isinstance(node, ast.Constant) and isinstance(node.value, int | float), "a number"
    return node.value


def called(node: ast.Call) -> str:
    """The name of what is called, such as `min` or `np.rint`."""
    function = node.func
    if isinstance(function, ast.Attribute):
        assert isinstance(function.value, ast.Name), "a name, or one of a module"
        return f"{function.value.id}.{function.attr}"
    assert isinstance(function, ast.Name), "a name"
    return function.id


def _is_array(scope: Scope, node: ast.Subscript) -> bool:
    return isinstance(node.value, ast.Name) and node.value.id in scope.arrays


def _chosen(builder: Any, condition: Value, first: Values, second: Values) -> Values:
    if isinstance(first, Value):
        assert isinstance(second, Value), "one value beside one"
        return chosen(builder, condition, first, second)
    assert isinstance(second, tuple), "a pair beside a pair"
    return tuple(_chosen(builder, condition, *pair) for pair in zip(first, second, strict=True))


def _inlined(scope: Scope, node: ast.Call) -> Values:
    function = scope.functions[called(node)]
    names = [argument.arg for argument in function.args.args]
    values = [evaluated(scope, argument) for argument in node.args]
    inner = InlineScope(scope, dict(zip(names, values, strict=True)))
    for statement in function.body:
        if isinstance(statement, ast.Return):
            assert statement.value is not None, "a function of the text has a value"
            return evaluated(inner, statement.value)
        name, value = assigned(statement)
        inner.names[name] = evaluated(inner, value)
    raise AssertionError("a function of the text ends with return")


def assigned(statement: ast.stmt) -> tuple[str, ast.expr]:
    """The name and the new value of an assignment to a variable; `a += b` is `a = a + b`."""
    if isinstance(statement, ast.AugAssign):
        assert isinstance(statement.target, ast.Name), "a variable"
        return statement.target.id, ast.BinOp(ast.Name(statement.target.id), statement.op, statement.value)
    assert isinstance(statement, ast.Assign) and isinstance(statement.targets[0], ast.Name), ast.unparse(statement)
    return statement.targets[0].id, statement.value
