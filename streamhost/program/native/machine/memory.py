"""Arrays of generated text: entries read and written, of one lane or of several. Nothing checks that they lie inside."""

from dataclasses import dataclass
from typing import Any

from llvmlite import ir

from streamhost.program.native.machine.kinds import Kind, Value, converted, shaped, spread


@dataclass(frozen=True)
class Array:
    """Where an array begins, how many entries a row of each dimension but the first has, and their kind."""

    pointer: Any
    lengths: tuple[Value, ...]
    kind: Kind


@dataclass(frozen=True)
class Place:
    """An entry `offset` entries behind a pointer; of several lanes that of the first, the others `step` entries apart."""

    kind: Kind
    pointer: Any
    offset: Any
    lanes: int
    step: Value | None

    @property
    def is_dense(self) -> bool:
        return self.step is not None and isinstance(self.step.machine, ir.Constant) and self.step.machine.constant == 1


def load(builder: Any, place: Place) -> Value:
    """What lies there; of several lanes only side by side."""
    if place.lanes == 1:
        return Value(place.kind, builder.load(builder.gep(place.pointer, [place.offset])))
    assert place.is_dense, "lanes are read side by side"
    return Value(place.kind, builder.load(_vector(builder, place), align=_bytes(place.kind)))


def store(builder: Any, place: Place, value: Value) -> None:
    """Put a value there, converted to the array's kind."""
    value = spread(builder, converted(builder, value, place.kind), place.lanes)
    if place.lanes == 1:
        builder.store(value.machine, builder.gep(place.pointer, [place.offset]))
    elif place.is_dense:
        builder.store(value.machine, _vector(builder, place), align=_bytes(place.kind))
    else:
        assert place.step is not None, "several lanes have a distance"
        offset = place.offset
        for lane in range(place.lanes):
            entry = builder.extract_element(value.machine, ir.Constant(ir.IntType(32), lane))
            builder.store(entry, builder.gep(place.pointer, [offset]))
            offset = builder.add(offset, place.step.machine)


def _vector(builder: Any, place: Place) -> Any:
    pointer = builder.gep(place.pointer, [place.offset])
    return builder.bitcast(pointer, shaped(place.kind, place.lanes).as_pointer())


def _bytes(kind: Kind) -> int:
    """Entries of an array are aligned to their own length, vectors to no more."""
    return {"uint8": 1, "float32": 4}.get(kind.name, 8)
