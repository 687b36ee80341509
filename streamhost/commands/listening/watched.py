"""Preset files that are saved while `listen` runs: taken up where they are sound, told where they are broken."""

from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING

from streamhost.commands.common import presets_named
from streamhost.commands.listening.asked import Asked, Prepared
from streamhost.errors import RequestError

if TYPE_CHECKING:
    from streamhost.live.controls import Controls
    from streamhost.live.files import Files, Taken


def preset_files(asked: Asked, ready: Prepared) -> "Files":
    """The files of all lanes. Each file makes as many, one after the other, as there are variants."""
    from streamhost.live.files import Files
    from streamhost.shipped import resolve

    each = len(ready.presets) // len(asked.presets)
    numbers: dict[Path, list[int]] = {}
    for place, name in enumerate(asked.presets):
        numbers.setdefault(resolve(name, "preset"), []).extend(range(place * each, (place + 1) * each))
    return Files(numbers, lambda path: _build(path, numbers[path], asked, ready))


def _build(path: Path, numbers: Sequence[int], asked: Asked, ready: Prepared) -> "list[Taken]":
    from streamhost.live.files import Taken
    from streamhost.presets.realizing import realize_presets

    presets = presets_named([str(path)], asked.variations)
    presets = [preset.at(ready.rate) for preset in presets * (len(numbers) // len(presets) or 1)]
    found = []
    for number, preset, realization in zip(numbers, presets, realize_presets(presets, ready.channels), strict=True):
        lane = replace(ready.lanes[number], realization=realization)
        found.append(Taken(preset, lane, lane.made(ready.channels)))
    return found


def follow(files: "Files", ready: Prepared, controls: "Controls") -> None:
    """Take up what has been built; what is broken is told, and the old version runs on."""
    for built in files.tend():
        try:
            if built.problem:
                raise RequestError(built.problem)
            for number, taken in zip(built.numbers, built.lanes, strict=True):
                controls.take_up(number, taken.asked, taken.lane)
                ready.presets[number], ready.lanes[number] = taken.preset, taken.asked
        except RequestError as problem:
            controls.notice = f"{built.path.name}: the old version is kept. {' '.join(str(problem).split())}"
