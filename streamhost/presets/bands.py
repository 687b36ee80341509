"""The [[filter]] tables of a preset, designed, and what they make of each channel.

Tables stand in cascade. Tables that follow each other and are for different channels stand at one place of it, and a
channel that has none at a place has a wire there: as many sections b = 1, 0, 0 and a = 1, 0, 0.
"""

from collections.abc import Sequence
from dataclasses import dataclass

from streamhost.errors import FilterError
from streamhost.filters import Filter
from streamhost.filters.entry import word

WIRE = (1, 0, 0, 1, 0, 0)


@dataclass(frozen=True)
class Band:
    """One [[filter]], designed at one rate, and the channels that it is for, counted from 1; none: all of them."""

    filter: Filter
    channels: tuple[int, ...] = ()

    def is_for(self, channel: int) -> bool:
        return not self.channels or channel in self.channels


Bands = tuple[Band, ...]


def highest_channel(bands: Bands) -> int:
    """The highest channel that is named; 0 where all are alike."""
    return max((channel for band in bands for channel in band.channels), default=0)


def filter_of(bands: Bands, channel: int) -> Filter:
    """The filter of a channel, counted from 1. FilterError where the bands do not go together."""
    parts = [_at_place(place, channel) for place in _places(bands)]
    return Filter.cascade(parts) if len(parts) > 1 else parts[0]


def filters_of(bands: Bands, channels: int) -> tuple[Filter, ...]:
    """The filter of each channel, or one for all where all are alike."""
    return tuple(filter_of(bands, channel) for channel in range(1, channels + 1 if highest_channel(bands) else 2))


def _places(bands: Bands) -> list[list[Band]]:
    """The bands at each place: a band joins the place before it if none there is for a channel that it is for."""
    places: list[list[Band]] = []
    for band in bands:
        before = {channel for other in places[-1] for channel in other.channels} if places else set()
        if before and band.channels and before.isdisjoint(band.channels):
            places[-1].append(band)
        else:
            places.append([band])
    return places


def _at_place(place: Sequence[Band], channel: int) -> Filter:
    own = next((band.filter for band in place if band.is_for(channel)), None)
    if own is not None:
        return own
    split = next((band for band in place if band.filter.branches), None)
    if split is not None:
        names, numbers = ", ".join(split.filter.outputs), ", ".join(map(str, split.channels))
        raise FilterError(
            f"the outputs {names} are stated for channel {numbers} only, and all channels have the same outputs. Leave "
            "channels out, or state such a filter for every channel."
        )
    return _wire([band.filter for band in place])


def _wire(beside: Sequence[Filter]) -> Filter:
    """What passes a channel on unchanged, in as many sections as others have there."""
    count = max(len(filter.factors) if filter.sections_given else 1 for filter in beside)
    codes = next((filter.codes for filter in beside if filter.codes is not None), None)
    if codes is None:
        return Filter.from_sections([WIRE] * count, rate=beside[0].rate)
    integer, fraction = word(codes.word)
    if integer < 2:
        raise FilterError(
            f"a channel without this filter multiplies by 1, which is no code of {codes.word}. Give the codes an integer bit "
            "more, or state a filter for every channel."
        )
    one = 1 << fraction
    return Filter.from_codes([[one, 0, 0, 0, 0]] * count, codes.word, rate=beside[0].rate)
