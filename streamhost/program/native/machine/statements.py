"""Statements of generated text, translated one after the other into the function that Numba is building."""

import ast
from collections import Counter
from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager
from typing import Any

from streamhost.program.native.machine.expressions import Array, address, assigned, called, evaluated, scalar
from streamhost.program.native.machine.kinds import KINDS, Value, Values, constant, converted


class Translation:
    """Translates a function of the text; `read` tells what a name means at the present place.

    What is assigned once is the value itself, what is assigned again has a place in memory, which LLVM turns into registers.
    """

    def __init__(self, builder: Any, functions: Mapping[str, ast.FunctionDef], arguments: Mapping[str, Value]) -> None:
        self.builder, self.functions = builder, functions
        self.arrays: dict[str, Array] = {}
        self._values: dict[str, Values] = dict(arguments)
        self._places: dict[str, Values] = {}  # values whose machine part is the address
        self._assignments = Counter[str]()

    def function(self, function: ast.FunctionDef) -> None:
        """Translate a whole body."""
        self._assignments = Counter(_assignments(function))
        self.body(function.body)

    def body(self, statements: Sequence[ast.stmt]) -> None:
        for statement in statements:
            self._statement(statement)

    def read(self, name: str) -> Values:
        if name in self._places:
            return self._loaded(self._places[name])
        return self._values[name]

    def _loaded(self, place: Values) -> Values:
        if isinstance(place, tuple):
            return tuple(self._loaded(entry) for entry in place)
        return Value(place.kind, self.builder.load(place.machine))

    def _statement(self, statement: ast.stmt) -> None:
        if isinstance(statement, ast.For):
            self._loop(statement)
        elif isinstance(statement, ast.If):
            assert not statement.orelse, "the text has no else"
            with self.builder.if_then(scalar(self, statement.test).machine):
                self.body(statement.body)
        elif _is_declaration(statement):
            self._declare(*assigned(statement))
        elif isinstance(statement, ast.Assign | ast.AugAssign) and isinstance(_target(statement), ast.Subscript):
            self._store(statement)
        else:
            name, value = assigned(statement)
            self._assign(name, evaluated(self, value))

    def _declare(self, name: str, call: ast.expr) -> None:
        """`x = carray(pointer, (rows, columns), np.kind)`."""
        assert isinstance(call, ast.Call) and isinstance(call.args[1], ast.Tuple), "pointer, lengths, kind"
        pointer = self.read(ast.unparse(call.args[0]))
        assert isinstance(pointer, Value), "an address"
        kind = KINDS[ast.unparse(call.args[2]).removeprefix("np.")]
        lengths = tuple(scalar(self, length) for length in call.args[1].elts[1:])
        typed = self.builder.bitcast(pointer.machine, kind.type.as_pointer())
        self.arrays[name] = Array(typed, lengths, kind)

    def _store(self, statement: ast.Assign | ast.AugAssign) -> None:
        target = _target(statement)
        assert isinstance(target, ast.Subscript), "an entry of an array"
        value: ast.expr = statement.value
        if isinstance(statement, ast.AugAssign):
            value = ast.BinOp(target, statement.op, statement.value)
        kind, place = address(self, target)
        self.builder.store(converted(self.builder, scalar(self, value), kind).machine, place)

    def _assign(self, name: str, value: Values) -> None:
        if self._assignments[name] < 2:
            self._values[name] = value
            return
        if name not in self._places:
            self._places[name] = self._allocated(value)
        self._put(self._places[name], value)

    def _allocated(self, value: Values) -> Values:
        if isinstance(value, tuple):
            return tuple(self._allocated(entry) for entry in value)
        with self.builder.goto_entry_block():
            return Value(value.kind, self.builder.alloca(value.kind.type))

    def _put(self, place: Values, value: Values) -> None:
        if isinstance(place, tuple):
            assert isinstance(value, tuple), "a pair into a pair"
            for pair in zip(place, value, strict=True):
                self._put(*pair)
            return
        assert isinstance(value, Value) and value.kind == place.kind, "a variable keeps its kind"
        self.builder.store(value.machine, place.machine)

    def _loop(self, loop: ast.For) -> None:
        """`for name in range(stop)` or `range(start, stop)`."""
        assert isinstance(loop.target, ast.Name) and isinstance(loop.iter, ast.Call), "a counted loop"
        limits = [scalar(self, limit) for limit in loop.iter.args]
        start, stop = limits if len(limits) == 2 else (constant(0), limits[0])
        with self._counted(start, stop) as count:
            self._values[loop.target.id] = count
            self.body(loop.body)

    @contextmanager
    def _counted(self, start: Value, stop: Value) -> Iterator[Value]:
        builder = self.builder
        before = builder.block
        test, inside, after = (builder.append_basic_block(name) for name in ("test", "inside", "after"))
        builder.branch(test)
        builder.position_at_end(test)
        count = builder.phi(start.kind.type)
        count.add_incoming(start.machine, before)
        builder.cbranch(builder.icmp_signed("<", count, stop.machine), inside, after)
        builder.position_at_end(inside)
        yield Value(start.kind, count)
        count.add_incoming(builder.add(count, constant(1).machine, flags=["nsw"]), builder.block)
        builder.branch(test)
        builder.position_at_end(after)


def _target(statement: ast.Assign | ast.AugAssign) -> ast.expr:
    return statement.targets[0] if isinstance(statement, ast.Assign) else statement.target


def _is_declaration(statement: ast.stmt) -> bool:
    value = statement.value if isinstance(statement, ast.Assign) else None
    return isinstance(value, ast.Call) and called(value) == "carray"


def _assignments(function: ast.FunctionDef) -> Iterator[str]:
    for node in ast.walk(function):
        if isinstance(node, ast.Assign | ast.AugAssign):
            target = _target(node)
            if isinstance(target, ast.Name):
                yield target.id
