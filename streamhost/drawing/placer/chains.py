"""Hubs, the chains of symbols between them, and which of the chains run backwards."""

from collections.abc import Sequence
from dataclasses import dataclass

from streamhost.drawing.sheet import Sheet

IN_CHAINS = frozenset({"gain", "delay", "round", "mark", "taps"})
WITH_DELAY = 1
WITHOUT_DELAY = 4
BARE = 3
"""Of a wire without any symbol that could be turned round: it would go all the way round."""
INTO_PILL = 1
"""More of a chain into an adder of many inputs, which has them all on the left."""
PASSES = 6


@dataclass(frozen=True)
class Chain:
    """Symbols of one input and one reader, in the direction of the signal, from hub to hub."""

    source: int
    sink: int
    symbols: tuple[int, ...]
    cost: int
    """Of drawing it backwards: little with a delay, which is where a loop is closed."""


def chains_of(sheet: Sheet) -> list[Chain]:
    """Every wire of the sheet is in one chain; a ring without a hub gets one."""
    after: dict[int, list[int]] = {i: [] for i in range(len(sheet.symbols))}
    before: dict[int, list[int]] = {i: [] for i in range(len(sheet.symbols))}
    for wire in sheet.wires:
        after[wire.source].append(wire.sink)
        before[wire.sink].append(wire.source)
    linked = {i for i, symbol in enumerate(sheet.symbols)
              if symbol.kind in IN_CHAINS and len(after[i]) == 1 and len(before[i]) == 1}
    hubs = [i for i in range(len(sheet.symbols)) if i not in linked]
    chains = [walked(sheet, hub, first, after, linked) for hub in hubs for first in after[hub]]
    left = linked - {symbol for chain in chains for symbol in chain.symbols}
    while left:
        hub = min(left)
        ring = walked(sheet, hub, after[hub][0], after, linked - {hub})
        chains.append(ring)
        left -= {hub, *ring.symbols}
    return chains


def walked(sheet: Sheet, hub: int, first: int, after: dict[int, list[int]], linked: set[int]) -> Chain:
    symbols: list[int] = []
    here = first
    while here in linked:
        symbols.append(here)
        here = after[here][0]
    delayed = any(sheet.symbols[i].kind == "delay" for i in (hub, *symbols))
    cost = WITHOUT_DELAY if not delayed else WITH_DELAY if symbols else BARE
    cost += INTO_PILL if symbols and sheet.symbols[here].kind == "pill" else 0
    return Chain(hub, here, tuple(symbols), cost)


def ordered_hubs(chains: Sequence[Chain]) -> list[int]:
    """The hubs in an order in which backward chains are cheap: each is taken out and put where it costs least."""
    order = sorted({hub for chain in chains for hub in (chain.source, chain.sink)})
    for _ in range(PASSES):
        before = list(order)
        for hub in before:
            order = reinserted(order, hub, chains)
        if order == before:
            break
    return order


def reinserted(order: Sequence[int], hub: int, chains: Sequence[Chain]) -> list[int]:
    """The order with one hub where the chains at it cost least; of equal places the one nearest to where it was."""
    rest = [other for other in order if other != hub]
    place = {other: i for i, other in enumerate(rest)}
    old = order.index(hub)
    change = [0] * (len(rest) + 2)
    for chain in chains:
        if chain.source == chain.sink or hub not in (chain.source, chain.sink):
            continue
        # Put at position p the hub stands before rest[p]: a chain out of it is backward where its sink is before p.
        if chain.source == hub:
            change[place[chain.sink] + 1] += chain.cost
        else:
            change[0] += chain.cost
            change[place[chain.source] + 1] -= chain.cost
    costs = [sum(change[: p + 1]) for p in range(len(rest) + 1)]
    best = min(range(len(costs)), key=lambda p: (costs[p], abs(p - old), p))
    return [*rest[:best], hub, *rest[best:]]
