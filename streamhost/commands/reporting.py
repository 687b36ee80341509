"""What every report is made of, whatever was run: the command, the drawing, the audio and the documents of results."""

import shlex
from collections.abc import Mapping
from pathlib import Path, PurePosixPath
from typing import Any

import click

from streamhost.commands.draw import drawn_diagram, rounded_nodes
from streamhost.commands.instruments import INSTRUMENTS
from streamhost.errors import DiagramError
from streamhost.files import AudioWriter, write_text_atomic
from streamhost.realization import Realization
from streamhost.report import AUDIO, DOCUMENTS, Sound
from streamhost.report.words import several


def command_line() -> str:
    """What was typed, to be typed again."""
    return shlex.join(("streamhost", *click.get_current_context().find_root().obj))


def drawing_of(realization: Realization) -> str:
    """The diagram with its roundings as SVG; empty where its places leave no room."""
    from streamhost.drawing import svg

    try:
        return svg(drawn_diagram(realization), rounded=rounded_nodes(realization))
    except DiagramError:
        return ""


def counts_of(realization: Realization) -> str:
    """What a frame costs."""
    counts = realization.program.drawn.counts()
    return ", ".join((several(counts.multiplications, "product"), several(counts.additions, "sum"),
                      several(counts.delays, "word")))


def sounds_of(folder: Path, results: Mapping[str, Any], rate: float, prefix: str = "") -> tuple[Sound, ...]:
    """The audio in the results of instruments, written into a report: 32-bit floats."""
    sounds = []
    for instrument in INSTRUMENTS:
        for wave in instrument.waves(results[instrument.name]) if instrument.name in results else ():
            path = folder / AUDIO / f"{prefix}{instrument.name}-{wave.name}.wav"
            frames, channels = wave.samples.shape
            with AudioWriter(path, rate=round(rate), channels=channels, subtype="float", frames_expected=frames) as writer:
                writer.write(wave.samples)
            name = f"{instrument.name}: {wave.name}".replace("_", " ").replace("-", " ").capitalize()
            sounds.append(Sound(name, PurePosixPath(AUDIO, path.name)))
    return tuple(sounds)


def documents_of(folder: Path, results: Mapping[str, Any], prefix: str = "") -> tuple[PurePosixPath, ...]:
    """The documents in the results of instruments, written into a report; a script is the same for all."""
    files = []
    for instrument in INSTRUMENTS:
        for document in instrument.documents(results[instrument.name]) if instrument.name in results else ():
            own = "" if document.name.endswith(".py") else prefix
            name = f"{own}{instrument.name}-{document.name}"
            write_text_atomic(folder / DOCUMENTS / name, document.text, overwrite=True)
            files.append(PurePosixPath(DOCUMENTS, name))
    return tuple(files)
