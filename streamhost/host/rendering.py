"""A file through a realization, or several that take over from each other: the host driven by a file."""

from collections.abc import Callable, Sequence
from contextlib import ExitStack
from dataclasses import dataclass, fields
from pathlib import Path

import numpy as np

from streamhost.errors import AudioFileError, RequestError
from streamhost.files import AudioInfo, AudioWriter, read_blocks, same_file
from streamhost.files.atomic import all_or_none
from streamhost.files.writing import Subtype
from streamhost.formats import Fixed, Format
from streamhost.host.engine import Host
from streamhost.host.lane import Lane
from streamhost.host.meters import Meters
from streamhost.host.plan import Change, Changed
from streamhost.realization import Realization, Tally

BLOCK = 16384
"""Frames of a block: more than a sound card takes at once, so that the work between blocks does not count."""


SUBTYPES: tuple[Subtype, ...] = ("pcm16", "pcm24", "pcm32", "float")


@dataclass(frozen=True)
class Written:
    """A file of one output (unnamed where there is one). `clipped` counts the samples beyond the file's full scale."""

    path: Path
    output: str
    clipped: int


@dataclass(frozen=True)
class Rendered:
    """What was written, and what happened on the way; meters and tally are those of all outputs together.

    With several lanes the meters are those of what is heard, and the tally that of all lanes.
    """

    files: tuple[Written, ...]
    container: str
    subtype: Subtype
    rate: int
    channels: int
    frames: int
    meters: Meters
    tally: Tally
    changes: tuple[Changed, ...] = ()


def default_subtype(format: Format) -> Subtype:
    """PCM of the shortest of 16, 24, 32 bits that holds the output word's fraction, 32 for what is longer; 24 for floats."""
    if not isinstance(format, Fixed):
        return "pcm24"
    fraction = format.output.word.fraction
    return "pcm16" if fraction <= 15 else "pcm24" if fraction <= 23 else "pcm32"


def render_file(
    realization: Realization,
    source: AudioInfo,
    destination: Path,
    *,
    name: str = "this realization",
    more: Sequence[Realization] = (),
    changes: Sequence[Change] = (),
    subtype: Subtype | None = None,
    overwrite: bool = False,
    report: Callable[[int], None] = lambda done: None,
) -> Rendered:
    """Run a file through a realization, from zero state, into a new file of the same rate and channels.

    Several outputs have a file each, all of them or none: OUT.wav becomes OUT-low.wav, OUT-high.wav.
    `more` are further lanes that run beside the first, lane 0, and take over by `changes`, each at its frame.
    `name` is what messages call the realization. `subtype` None takes `default_subtype`. `report(done)` hears before
    each block how many frames are done. Memory does not grow with the file's length; when anything goes wrong, Ctrl-C
    too, no output is left. Raises RequestError where the rates differ, the realization has words that samples do not hold,
    or output and input are one file; AudioFileError and MachineError as reading and writing do, and where the output is no
    longer finite.
    """
    lanes, paths = (realization, *more), output_paths(destination, realization.outputs)
    _check(lanes, changes, source, paths, name)
    longest: Subtype = max((default_subtype(each.format) for each in lanes), key=SUBTYPES.index)
    kind = subtype or longest
    writers = [_writer(path, source, kind, overwrite=overwrite) for path in paths]
    with all_or_none(paths), ExitStack() as stack:
        for writer in writers:
            stack.enter_context(writer)
        host = _host(lanes, changes, source.channels)
        heard = Meters()
        for block in read_blocks(source.path, BLOCK):
            report(host.frames)
            host.step(block)
            heard = heard.plus(host.heard_block) if more else host.lanes[0].meters
            _check_finite(heard, destination, name)
            for writer, output in zip(writers, np.split(host.heard_block, len(writers), axis=1), strict=True):
                writer.write(output)
    return Rendered(
        _written(paths, realization, writers),
        writers[0].container,
        writers[0].subtype,
        source.rate,
        source.channels,
        writers[0].frames,
        heard,
        _together([lane.tally() for lane in host.lanes]),
        host.plan.changed,
    )


def _written(paths: Sequence[Path], realization: Realization, writers: Sequence[AudioWriter]) -> tuple[Written, ...]:
    names = realization.outputs if len(paths) > 1 else ("",)
    written = zip(paths, names, writers, strict=True)
    return tuple(Written(path, output, writer.clipped) for path, output, writer in written)


def _host(realizations: Sequence[Realization], changes: Sequence[Change], channels: int) -> Host:
    """Lanes of these realizations, with every change planned."""
    lanes = [Lane(each, channels, metered=isinstance(each.format, Fixed)) for each in realizations]
    host = Host(lanes, BLOCK, waiting=max(1, len(changes)))
    for change in sorted(changes, key=lambda change: change.frame):
        host.plan.change(change)
    return host


def _together(tallies: Sequence[Tally]) -> Tally:
    return Tally(*(sum(getattr(tally, kind.name) for tally in tallies) for kind in fields(Tally)))


def _writer(path: Path, source: AudioInfo, subtype: Subtype, *, overwrite: bool) -> AudioWriter:
    return AudioWriter(path, rate=source.rate, channels=source.channels, subtype=subtype, frames_expected=source.frames,
                       overwrite=overwrite)


def output_paths(destination: Path, outputs: Sequence[str]) -> tuple[Path, ...]:
    """The file of each output: the destination itself where there is one."""
    if len(outputs) == 1:
        return (destination,)
    return tuple(destination.with_name(f"{destination.stem}-{output}{destination.suffix}") for output in outputs)


def _check(lanes: Sequence[Realization], changes: Sequence[Change], source: AudioInfo, paths: Sequence[Path],
           name: str) -> None:
    for realization in lanes:
        _check_lane(realization, source, name)
    for change in changes:
        if change.frame >= source.frames:
            raise RequestError(f"A change at frame {change.frame} is never reached: {source.path} has {source.frames} frames, "
                               "counted from 0.")
    for path in paths:
        if same_file(source.path, path):
            raise RequestError(f"{path}: input and output are the same file. Choose another name for the output.")


def _check_lane(realization: Realization, source: AudioInfo, name: str) -> None:
    rate = realization.rate
    if source.rate != rate:
        raise RequestError(
            f"{source.path} has a rate of {source.rate} Hz, and {name} is a filter for {rate:g} Hz. Rates are not "
            "converted: give a file of that rate, or a filter for this one."
        )
    realization.check_samples(name)


def _check_finite(meters: Meters, destination: Path, name: str) -> None:
    if not meters.is_finite:
        raise AudioFileError(
            f"{destination}: nothing was written, since the output of {name} is no longer finite before frame "
            f"{meters.frames}. Its filter is unstable, or its input is louder than its arithmetic can hold."
        )
