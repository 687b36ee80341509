"""Generated text as machine code: a small part of Python, translated to LLVM inside a function that Numba compiles.

The text is Python that anyone can read: assignments, counted loops, `while`, `if`, the operators, the calls of
`operations.CALLS`, arrays declared by `carray(address, lengths, kind)`, pairs, and functions of its own that end with `return`.
Every value has one kind, which conversions in the text fix, so that no type need be inferred, which is what takes long in
Numba's own front end.
"""
# mypy: disallow-untyped-decorators=False

import ast
import hashlib
import linecache
from collections.abc import Callable
from functools import cache
from pathlib import Path
from typing import Any

from numba import types
from numba.extending import intrinsic

from streamhost.program.native.machine.kinds import KINDS, Kind, Value
from streamhost.program.native.machine.statements import Translation

SIGNATURE = types.void(*([types.voidptr] * 8), types.int64, types.int64, types.int64)
ADDRESS = Kind("address", None)


def machine_code(width: int) -> Callable[[Callable[..., None]], Any]:
    """A kernel's function in a generated module as one that Numba inlines: eight addresses and three int64; it returns nothing.

    The loop over `c` goes over `width` lanes at once, and over the rest one by one. The text is read when Numba compiles, not
    when machine code is taken from disk.
    """
    return lambda function: _inlined(function, width)


def _inlined(function: Callable[..., None], width: int) -> Any:

    @intrinsic
    def run(
        typingctx: Any, x: Any, y: Any, state: Any, coefficients: Any, keys: Any, meters: Any, marks: Any, trace: Any,
        frames: Any, channels: Any, frame0: Any,
    ) -> Any:
        def generate(context: Any, builder: Any, signature: Any, values: Any) -> Any:
            _translate(function, width, builder, signature.args, values)
            return context.get_dummy_value()

        return SIGNATURE, generate

    return run


def _translate(function: Callable[..., None], width: int, builder: Any, kinds: Any, values: Any) -> None:
    lines = linecache.getlines(function.__code__.co_filename)
    module = ast.parse("".join(lines))
    functions = {node.name: node for node in module.body if isinstance(node, ast.FunctionDef)}
    text = functions.pop(function.__name__)
    names = [argument.arg for argument in text.args.args]
    arguments = {
        name: Value(KINDS["int64"] if kind == types.int64 else ADDRESS, value)
        for name, kind, value in zip(names, kinds, values, strict=True)
    }
    Translation(builder, functions, arguments, width).function(text)


@cache
def machine_hash() -> str:
    """Of the files that turn text into machine code: a change there makes other kernels."""
    files = sorted(Path(__file__).parent.glob("*.py"))
    return hashlib.sha256(b"".join(file.read_bytes() for file in files)).hexdigest()[:16]
