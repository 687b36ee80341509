"""Statements of generated text, translated one after the other into the function that Numba is building."""

import ast
from collections import Counter
from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager
from typing import Any

from streamhost.program.native.machine.expressions import LANE, assigned, called, evaluated, names, place, scalar
from streamhost.program.native.machine.kinds import KINDS, Value, Values, constant, spread
from streamhost.program.native.machine.memory import Array, store


class Translation:
    """Translates a function of the text; `read` tells what a name means at the present place.

    What is assigned once is the value itself, what is assigned again has a place in memory, which LLVM turns into registers.
    The loop over lanes goes over `width` of them at once as long as there are so many, and over the rest one by one.
    """

    def __init__(
        self, builder: Any, functions: Mapping[str, ast.FunctionDef], arguments: Mapping[str, Value], width: int
    ) -> None:
        self.builder, self.functions, self.lanes = builder, functions, 1
        self.arrays: dict[str, Array] = {}
        self._width = width
        self._values: dict[str, Values] = dict(arguments)
        self._places: dict[str, Values] = {}  # values whose machine part is the address
        self._assignments = Counter[str]()
        self._varying = set[str]()  # names whose values differ from lane to lane

    def function(self, function: ast.FunctionDef) -> None:
        """Translate a whole body."""
        self._assignments = Counter(name for name, _ in _assignments(function))
        self._varying = _varying(function)
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
        elif isinstance(statement, ast.While):
            self._while(statement)
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
        store(self.builder, place(self, target), scalar(self, value))

    def _assign(self, name: str, value: Values) -> None:
        if self._assignments[name] < 2:
            self._values[name] = value
            return
        if name in self._varying:
            value = self._spread(value)
        if name not in self._places:
            self._places[name] = self._allocated(value)
        self._put(self._places[name], value)

    def _spread(self, value: Values) -> Values:
        if isinstance(value, tuple):
            return tuple(self._spread(entry) for entry in value)
        return spread(self.builder, value, self.lanes)

    def _allocated(self, value: Values) -> Values:
        if isinstance(value, tuple):
            return tuple(self._allocated(entry) for entry in value)
        with self.builder.goto_entry_block():
            return Value(value.kind, self.builder.alloca(value.machine.type))

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
        if loop.target.id != LANE:
            with self._counted(start, stop, 1) as self._values[loop.target.id]:
                self.body(loop.body)
            return
        for width in [self._width, 1] if self._width > 1 else [1]:
            before = dict(self._values), dict(self._places)
            self.lanes = width
            with self._counted(start, stop, width) as start:
                self._values[LANE] = start
                self.body(loop.body)
            self._values, self._places = before  # the same variables in another shape, the next time

    def _while(self, loop: ast.While) -> None:
        builder = self.builder
        test, inside, after = (builder.append_basic_block(name) for name in ("while", "inside", "after"))
        builder.branch(test)
        builder.position_at_end(test)
        builder.cbranch(scalar(self, loop.test).machine, inside, after)
        builder.position_at_end(inside)
        self.body(loop.body)
        builder.branch(test)
        builder.position_at_end(after)

    @contextmanager
    def _counted(self, start: Value, stop: Value, step: int) -> Iterator[Value]:
        """From start, as long as so many steps fit below stop; behind the loop the value is the first that was not taken."""
        builder, by = self.builder, constant(step).machine
        before = builder.block
        test, inside, after = (builder.append_basic_block(name) for name in ("test", "inside", "after"))
        builder.branch(test)
        builder.position_at_end(test)
        count = builder.phi(start.kind.type)
        count.add_incoming(start.machine, before)
        following = builder.add(count, by, flags=["nsw"])
        builder.cbranch(builder.icmp_signed("<=", following, stop.machine), inside, after)
        builder.position_at_end(inside)
        yield Value(start.kind, count)
        count.add_incoming(following, builder.block)
        builder.branch(test)
        builder.position_at_end(after)


def _target(statement: ast.Assign | ast.AugAssign) -> ast.expr:
    return statement.targets[0] if isinstance(statement, ast.Assign) else statement.target


def _is_declaration(statement: ast.stmt) -> bool:
    value = statement.value if isinstance(statement, ast.Assign) else None
    return isinstance(value, ast.Call) and called(value) == "carray"


def _assignments(function: ast.FunctionDef) -> Iterator[tuple[str, ast.expr]]:
    """Every assignment to a variable: its name and what it is given."""
    for node in ast.walk(function):
        if isinstance(node, ast.Assign | ast.AugAssign):
            target = _target(node)
            if isinstance(target, ast.Name):
                yield target.id, node.value


def _varying(function: ast.FunctionDef) -> set[str]:
    """The names that depend on the lane, directly or through others."""
    depends = [(name, names(value)) for name, value in _assignments(function)]
    varying = {LANE}
    while more := {name for name, read in depends if name not in varying and read & varying}:
        varying |= more
    return varying
