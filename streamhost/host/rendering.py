"""A file through one realization, block by block: the host driven by a file instead of a sound card."""

from collections.abc import Callable, Sequence
from contextlib import ExitStack
from dataclasses import dataclass
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
from streamhost.realization import Realization, Tally

BLOCK = 16384
"""Frames of a block: more than a sound card takes at once, so that the work between blocks does not count."""


@dataclass(frozen=True)
class Written:
    """A file of one output (unnamed where there is one). `clipped` counts the samples beyond the file's full scale."""

    path: Path
    output: str
    clipped: int


@dataclass(frozen=True)
class Rendered:
    """What was written, and what happened on the way; meters and tally are those of all outputs together."""

    files: tuple[Written, ...]
    container: str
    subtype: Subtype
    rate: int
    channels: int
    frames: int
    meters: Meters
    tally: Tally


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
    subtype: Subtype | None = None,
    overwrite: bool = False,
    report: Callable[[int], None] = lambda done: None,
) -> Rendered:
    """Run a file through a realization, from zero state, into a new file of the same rate and channels.

    Several outputs have a file each, all of them or none: OUT.wav becomes OUT-low.wav, OUT-high.wav.
    `name` is what messages call the realization. `subtype` None takes `default_subtype`. `report(done)` hears before
    each block how many frames are done. Memory does not grow with the file's length; when anything goes wrong, Ctrl-C
    too, no output is left. Raises RequestError where the rates differ, the realization has words that samples do not hold,
    or output and input are one file; AudioFileError and MachineError as reading and writing do, and where the output is no
    longer finite.
    """
    paths = output_paths(destination, realization.outputs)
    _check(realization, source, paths, name)
    kind = subtype or default_subtype(realization.format)
    writers = [_writer(path, source, kind, overwrite=overwrite) for path in paths]
    with all_or_none(paths), ExitStack() as stack:
        for writer in writers:
            stack.enter_context(writer)
        lane = Lane(realization, source.channels, metered=isinstance(realization.format, Fixed))
        host = Host([lane], BLOCK)
        for block in read_blocks(source.path, BLOCK):
            report(host.frames)
            host.step(block)
            _check_finite(lane.meters, destination, name)
            for writer, output in zip(writers, np.split(lane.output, len(writers), axis=1), strict=True):
                writer.write(output)
    names = realization.outputs if len(paths) > 1 else ("",)
    written = zip(paths, names, writers, strict=True)
    return Rendered(
        tuple(Written(path, output, writer.clipped) for path, output, writer in written),
        writers[0].container,
        writers[0].subtype,
        source.rate,
        source.channels,
        writers[0].frames,
        lane.meters,
        lane.tally(),
    )


def _writer(path: Path, source: AudioInfo, subtype: Subtype, *, overwrite: bool) -> AudioWriter:
    return AudioWriter(path, rate=source.rate, channels=source.channels, subtype=subtype, frames_expected=source.frames,
                       overwrite=overwrite)


def output_paths(destination: Path, outputs: Sequence[str]) -> tuple[Path, ...]:
    """The file of each output: the destination itself where there is one."""
    if len(outputs) == 1:
        return (destination,)
    return tuple(destination.with_name(f"{destination.stem}-{output}{destination.suffix}") for output in outputs)


def _check(realization: Realization, source: AudioInfo, paths: Sequence[Path], name: str) -> None:
    rate = realization.rate
    if source.rate != rate:
        raise RequestError(
            f"{source.path} has a rate of {source.rate} Hz, and {name} is a filter for {rate:g} Hz. Rates are not "
            "converted: give a file of that rate, or a filter for this one."
        )
    realization.check_samples(name)
    for path in paths:
        if same_file(source.path, path):
            raise RequestError(f"{path}: input and output are the same file. Choose another name for the output.")


def _check_finite(meters: Meters, destination: Path, name: str) -> None:
    if not meters.is_finite:
        raise AudioFileError(
            f"{destination}: nothing was written, since the output of {name} is no longer finite before frame "
            f"{meters.frames}. Its filter is unstable, or its input is louder than its arithmetic can hold."
        )
