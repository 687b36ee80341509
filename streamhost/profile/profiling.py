"""Realizations in, what they cost out."""

from collections.abc import Mapping, Sequence
from math import inf
from statistics import median

from streamhost.formats import Float
from streamhost.profile.chains import longest_way, slowest_loop
from streamhost.profile.cores import Core, estimate
from streamhost.profile.counters import Counted, counted
from streamhost.profile.driver import CYCLES_PER_STEP, Lane, Machine
from streamhost.profile.machine import busy_cycles
from streamhost.profile.operations import work
from streamhost.profile.result import BlockTime, Bounds, Method, Profile, Profiled, TailTime, Timing
from streamhost.profile.timing import (
    BLOCKS,
    BLOCKS_A_ROUND,
    ROUNDS,
    TAIL_BLOCK,
    Key,
    Report,
    Timer,
    Times,
    spread_percent,
    timed,
    undisturbed,
)
from streamhost.realization import Realization

COUNTED_BLOCK = 1024


def unheard(share: float, doing: str) -> None:
    """A report that goes nowhere."""


def profile(
    asked: Sequence[Sequence[tuple[Realization, int]]], core: Core | None = None, *, rounds: int = ROUNDS,
    report: Report = unheard, timer: Timer | None = None,
) -> Profile:
    """What realizations cost: each as it is for one or more numbers of channels, (realization, channels).

    rounds: at least 2; up to five times as many where the core is shared. MachineError where this system has no clock that
    compiled code can read.
    """
    timer = timer or Machine()
    flat = [(one, channels) for each in asked for one, channels in each]
    lanes = [Lane(realization, channels) for realization, channels in flat]
    with undisturbed() as pinned:
        tails = [_has_tail(realization) for realization, _ in flat]
        times = timed(lanes, tails, timer, rounds, report)
        counts = [_count(lane, timer) for lane in lanes]
    method = Method(times.rounds, BLOCKS_A_ROUND, pinned, CYCLES_PER_STEP / times.chain, times.drift_percent,
                    times.shared_percent, times.doubtful_percent,
                    next((each.reason for each in counts), None))
    counted_rounds = {key: times.counted(key) for key in times.samples}
    timings = [_timing(place, lanes, times, counted_rounds, counts[place]) for place in range(len(lanes))]
    found, first = [], 0
    for each in asked:
        found.append(_profiled(each, timings[first : first + len(each)], core, method.clock_ghz))
        first += len(each)
    return Profile(method, tuple(found))


def bounds_of(realization: Realization, clock_ghz: float, measured_ns: float | None) -> Bounds:
    """Loop and operations against each other; nothing is timed."""
    program = realization.program
    loop, busy = slowest_loop(program), float(busy_cycles(program))
    around = float(loop.cycles_per_frame) if loop is not None else 0.0
    return Bounds(
        loop_cycles=around,
        way_cycles=float(longest_way(program)),
        busy_cycles=busy,
        rules="loop" if around > busy else "operations",
        loop_path=tuple(program.nodes[index].label for index in loop.nodes) if loop is not None else (),
        bound_ns=max(around, busy) / clock_ghz,
        measured_cycles=measured_ns * clock_ghz if measured_ns is not None else None,
    )


def _has_tail(realization: Realization) -> bool:
    return isinstance(realization.format, Float) and realization.program.state_words > 0


def _count(lane: Lane, timer: Timer) -> Counted:
    return counted(lambda: timer.block_times(lane, COUNTED_BLOCK, BLOCKS_A_ROUND))


def _profiled(asked: Sequence[tuple[Realization, int]], timings: Sequence[Timing], core: Core | None, ghz: float) -> Profiled:
    realization = asked[0][0]
    alone = [block.ns_per_frame for timing in timings if timing.channels == 1
             for block in timing.blocks if block.block_frames == COUNTED_BLOCK]
    return Profiled(
        work(realization.program),
        bounds_of(realization, ghz, alone[0] if alone else None),
        tuple(timings),
        estimate(realization.program, core, realization.rate) if core is not None else None,
    )


def _timing(place: int, lanes: Sequence[Lane], times: Times, found: Mapping[Key, list[float]], counts: Counted) -> Timing:
    lane = lanes[place]
    frames = COUNTED_BLOCK * BLOCKS_A_ROUND
    return Timing(
        channels=lane.channels,
        width=lane.width,
        blocks=tuple(_block_time((place, length, False), lanes, times, found) for length in BLOCKS),
        tail=_tail_time(place, found),
        instructions_per_frame=counts.instructions / frames if counts.instructions is not None else None,
        cycles_per_frame=counts.cycles / frames if counts.cycles is not None else None,
    )


def _block_time(key: Key, lanes: Sequence[Lane], times: Times, found: Mapping[Key, list[float]]) -> BlockTime:
    place, length, _ = key
    rate, blocks = lanes[place].realization.rate, times.blocks(key)
    cheapest = min(median(found[other, length, False]) for other, lane in enumerate(lanes)
                   if lane.channels == lanes[place].channels)
    ns = median(found[key])
    share = ns * rate / 1e9
    return BlockTime(
        block_frames=length,
        ns_per_frame=ns,
        spread_percent=spread_percent(found[key]),
        deadline_percent=100.0 * share,
        lanes_per_core=1.0 / share if share else inf,
        deadline_us=1e6 * length / rate,
        p999_block_us=float(blocks[-(-999 * len(blocks) // 1000) - 1]) / 1000.0,
        worst_block_us=float(blocks[-1]) / 1000.0,
        times_cheapest=ns / cheapest if cheapest else inf,
    )


def _tail_time(place: int, found: Mapping[Key, list[float]]) -> TailTime | None:
    key = (place, TAIL_BLOCK, True)
    if key not in found:
        return None
    ns, normal = median(found[key]), median(found[place, TAIL_BLOCK, False])
    return TailTime(TAIL_BLOCK, ns, spread_percent(found[key]), ns / normal if normal else inf)
