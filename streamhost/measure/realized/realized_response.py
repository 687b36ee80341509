"""The response with rounded coefficients against what was asked for."""

from collections.abc import Iterator, Sequence
from dataclasses import replace
from math import inf

from streamhost.measure.bands import Band
from streamhost.measure.deviation import Responses, response_deviation
from streamhost.measure.limits import limit_band
from streamhost.measure.realized.delays import output_response
from streamhost.measure.realized.masks import mask_margin
from streamhost.measure.realized.result import BandDeviation, MaskMargin, OutputResponse, Response, Root
from streamhost.measure.realized.roots import poles_of, zeros_of
from streamhost.measure.realized.stability import stability_of
from streamhost.realization import Realization

SUM = "sum"


def response(
    realization: Realization, bands: Sequence[Band] | None = None, masks: Sequence[str] = (), *,
    mask_hz: float | None = None, judged_only: bool = False,
) -> Response:
    """What rounding the coefficients did.

    bands: from where to where, in Hz, the deviation is told; unless given, 20 Hz to 20 kHz. masks: names of MASKS, of
    standards; mask_hz: the nominal mid-band of theirs, unless given the one that fits best. judged_only: nothing but
    deviation, leak, stability and masks. Raises RequestError for a mask that there is not.
    """
    judged = [limit_band({}, realization.rate)] if bands is None else list(bands)
    each = tuple(found for band in judged for found in _over(realization, band))
    channels = range(realization.program.diagram.channels)
    poles, poles_reason = ((), "not asked for") if judged_only else poles_of(realization, 0)
    worst = max(each, key=lambda one: inf if one.deviation_db is None else one.deviation_db)
    radii = [root.radius for root in poles if root.radius is not None]
    return Response(
        deviation_db=worst.deviation_db,
        deviation_hz=worst.deviation_hz,
        leak_db=max([one.leak_db for one in each if one.leak_db is not None], default=None),
        stability=replace(stability_of(realization), largest_radius=max(radii, default=None)),
        bands=each,
        masks=tuple(margin for name in masks for margin in _masks(realization, name, mask_hz)),
        outputs=() if judged_only else tuple(_outputs(realization, 0, judged[0])),
        poles=poles,
        poles_reason=poles_reason,
        channel=1 if len(channels) > 1 else None,
    )


def _names(realization: Realization) -> tuple[str, ...]:
    return realization.outputs if len(realization.outputs) > 1 else ("",)


def _over(realization: Realization, band: Band) -> Iterator[BandDeviation]:
    """Of each output, and of their sum where the filter has several."""
    names = _names(realization)
    exits: list[tuple[str, tuple[int, ...]]] = [(name, (place,)) for place, name in enumerate(names)]
    if 1 < len(realization.filter.outputs) == len(names):
        exits.append((SUM, tuple(range(len(names)))))
    for name, places in exits:
        found = response_deviation(realization, band, places)
        yield BandDeviation(name, *band, found.db, found.hz, found.leak_db, found.reason)


def _masks(realization: Realization, name: str, mask_hz: float | None) -> Iterator[MaskMargin]:
    """Of each output, the channel that is nearest to the edge or beyond."""
    for place, output in enumerate(_names(realization)):
        margins = [mask_margin(Responses(realization, channel, (place,)), name, output, mask_hz)
                   for channel in range(realization.program.diagram.channels)]
        yield min(margins, key=lambda margin: -inf if margin.margin_db is None else margin.margin_db)


def _outputs(realization: Realization, channel: int, band: Band) -> Iterator[OutputResponse]:
    for place, name in enumerate(_names(realization)):
        zeros: tuple[tuple[Root, ...], str] = zeros_of(realization, channel, place)
        yield output_response(Responses(realization, channel, (place,)), name, band, *zeros)
