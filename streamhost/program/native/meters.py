"""Where a metered kernel counts what: after the counter of NaN samples, one counter a rounding, one a counted sum."""

from streamhost.diagram.nodes import Round, Taps
from streamhost.program.program import Program


def meter_places(program: Program) -> dict[int, int]:
    """The counter of each rounding and each counted sum; that of a tapped line's own operands under -1 - its index."""
    keys = [*program.roundings, *program.counted_sums]
    keys += [-1 - index for index, node in enumerate(program.nodes) if isinstance(node, Taps)]
    return {key: 1 + place for place, key in enumerate(keys)}


def meter_count(program: Program) -> int:
    """All counters, that of NaN samples included."""
    return 1 + len(meter_places(program))


def meters_by_kind(program: Program) -> tuple[list[int], list[int], list[int]]:
    """The counters of saturations, of wraps, and of accumulator overflows."""
    saturations: list[int] = []
    wraps: list[int] = []
    overflows: list[int] = []
    for key, place in meter_places(program).items():
        node = program.nodes[key] if key >= 0 else program.nodes[-1 - key]
        if key >= 0 and not isinstance(node, Round):
            overflows.append(place)
        elif isinstance(node, Round) and node.quantizer is not None and node.quantizer.overflow == "wrap":
            wraps.append(place)
        else:
            saturations.append(place)
    return saturations, wraps, overflows
