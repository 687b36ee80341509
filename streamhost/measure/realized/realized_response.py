"""The response with rounded coefficients against what was asked for."""

from collections.abc import Iterator, Sequence
from math import inf

from streamhost.measure.bands import Band
from streamhost.measure.deviation import response_deviation
from streamhost.measure.limits import limit_band
from streamhost.measure.realized.result import BandDeviation, Response
from streamhost.realization import Realization

SUM = "sum"


def response(realization: Realization, bands: Sequence[Band] | None = None) -> Response:
    """What rounding the coefficients did over each of the bands, in Hz; unless given, 20 Hz to 20 kHz."""
    judged = [limit_band({}, realization.rate)] if bands is None else list(bands)
    each = tuple(found for band in judged for found in _over(realization, band))
    worst = max(each, key=lambda one: inf if one.deviation_db is None else one.deviation_db)
    leaks = [one.leak_db for one in each if one.leak_db is not None]
    return Response(
        deviation_db=worst.deviation_db,
        deviation_hz=worst.deviation_hz,
        leak_db=max(leaks, default=None),
        unstable_poles=realization.unstable,
        bands=each,
    )


def _over(realization: Realization, band: Band) -> Iterator[BandDeviation]:
    """Of each output, and of their sum where the filter has several."""
    names = realization.outputs if len(realization.outputs) > 1 else ("",)
    exits: list[tuple[str, tuple[int, ...]]] = [(name, (place,)) for place, name in enumerate(names)]
    if 1 < len(realization.filter.outputs) == len(names):
        exits.append((SUM, tuple(range(len(names)))))
    for name, places in exits:
        found = response_deviation(realization, band, places)
        yield BandDeviation(name, *band, found.db, found.hz, found.leak_db, found.reason)
