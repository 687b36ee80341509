"""What the instrument `response` says."""

from collections.abc import Iterator

from streamhost.commands.common import MINUS, Column, ledger
from streamhost.measure import Response
from streamhost.measure.realized import OutputResponse, Root, Stability

BANDS = (
    Column("output"), Column("from", "Hz", 1), Column("to", "Hz", 1), Column("deviates", "dB", 3), Column("at", "Hz", 1),
    Column("leak", "dB", 1),
)
DELAYS = (
    Column("output"), Column("latency", "frames", 2), Column("", "ms", 3), Column("begins", "frame"),
    Column("delay from", "frames", 2), Column("to", "frames", 2), Column("off by", "frames", 3),
    Column("phase off", "degrees", 3),
)
ROOTS = (
    Column(""), Column("as asked"), Column("as stored"), Column("radius", "", 6), Column("angle", "Hz", 1), Column("moved by"),
    Column("one step moves it by"),
)
MOST_ROOTS = 24


def lines(result: Response) -> Iterator[str]:
    """Ledgers of bands, delays, poles and zeros; stability; masks; why figures are missing."""
    yield ledger(BANDS, [[_name(one.output), one.low_hz, one.high_hz, one.deviation_db, one.deviation_hz, one.leak_db]
                         for one in result.bands], numbered=False)
    yield from dict.fromkeys(f"No figure: {one.reason}." for one in result.bands if one.reason)
    if result.outputs:
        yield ledger(DELAYS, [_delay(one) for one in result.outputs], numbered=False)
    if result.outputs and result.channel is not None:
        yield f"Delays, poles and zeros are those of channel {result.channel}."
    yield _stability(result.stability)
    yield from _roots(result)
    for mask in result.masks:
        if mask.margin_db is not None:
            of = f"{mask.output}: " if mask.output else ""
            band = f" about {mask.nominal_hz:g} Hz" if mask.nominal_hz is not None else ""
            side = "inside" if mask.margin_db >= 0.0 else "outside"
            yield f"{of}{mask.mask}{band} ({mask.source}): {abs(mask.margin_db):.2f} dB {side} at {mask.margin_hz:g} Hz."


def _name(output: str) -> str:
    return output or "y"


def _delay(one: OutputResponse) -> list[str | int | float | None]:
    return [_name(one.output), one.latency_frames, one.latency_ms, one.onset_frames, one.group_delay_least_frames,
            one.group_delay_most_frames, one.group_delay_deviation_frames, one.phase_deviation_degrees]


def _stability(found: Stability) -> str:
    said = {
        "stable": "Stable",
        "marginal": f"Marginal: {_poles(found.on_circle)} on the unit circle, none outside",
        "unstable": f"Unstable: {_poles(found.outside)} outside the unit circle" + (
            f" and {_poles(found.on_circle)} on it" if found.on_circle else ""),
    }[found.verdict]
    largest = f", largest reflection coefficient {found.largest_reflection:.9g}" if found.largest_reflection is not None else ""
    cancelled = f"; {_poles(found.cancelled)} on it cancelled exactly" if found.cancelled else ""
    return f"{said} (lattice test, exact{largest}){cancelled}."


def _poles(count: int) -> str:
    return "1 pole" if count == 1 else f"{count} poles"


def _roots(result: Response) -> Iterator[str]:
    rows = [["pole", *_root(root)] for root in result.poles]
    for one in result.outputs:
        rows += [[f"zero to {one.output}" if one.output else "zero", *_root(root)] for root in one.zeros]
    if rows:
        yield ledger(ROOTS, rows[:MOST_ROOTS], numbered=False)
    if len(rows) > MOST_ROOTS:
        yield f"{len(rows) - MOST_ROOTS} more are in the JSON."
    if result.poles_reason:
        yield f"No poles are told: {result.poles_reason}."
    yield from dict.fromkeys(f"No zeros are told: {one.zeros_reason}." for one in result.outputs if one.zeros_reason)


def _root(root: Root) -> list[str | float | None]:
    furthest = max(root.steps, key=lambda step: step.moves, default=None)
    step = f"{furthest.moves:.2g}, {furthest.coefficient}" if furthest is not None else ""
    moved = "" if root.moved is None else f"{root.moved:.2g}"
    return [_point(root.asked_real, root.asked_imaginary), _point(root.stored_real, root.stored_imaginary),
            root.radius, root.hz, moved.replace("-", MINUS), step.replace("e-", f"e{MINUS}")]


def _point(real: float | None, imaginary: float | None) -> str | None:
    if real is None or imaginary is None:
        return None
    beside = f" ± {abs(imaginary):.6f}j" if imaginary else ""
    return f"{real:.6f}{beside}".replace("-", MINUS)
