"""The files that `measure` writes: audio of worst cases, documents of results."""

from collections.abc import Sequence
from pathlib import Path
from typing import Any

from streamhost.commands.common import check_folder, check_new, make_folder
from streamhost.commands.instruments import Asked, Instrument
from streamhost.files import AudioWriter, write_text_atomic


class WaveFolder:
    """A folder for the audio that instruments find, 32-bit floats, named by preset, instrument and case.

    RequestError, before any work, where the folder cannot be one, or holds audio of such a run already, unless `force`.
    """

    def __init__(
        self, folder: str | None, asked: Asked, input: Path | None, instruments: Sequence[Instrument], *, force: bool
    ) -> None:
        self._folder = Path(folder) if folder is not None else None
        self._rate, self._force = asked.realization.rate, force
        self._stem = asked.preset.path.stem if asked.preset.path else "preset"
        if self._folder is None:
            return
        check_folder(self._folder)
        for path in sorted(path for each in instruments for path in self._folder.glob(f"{self._stem}-{each.name}-*")):
            check_new(path, input, force=force)

    def write(self, instrument: Instrument, result: Any) -> list[Path]:
        """The audio and the documents of a result, each file whole or not at all; the files."""
        written = []
        for wave in instrument.waves(result) if self._folder is not None else ():
            assert self._folder is not None, "without a folder nothing is written"
            make_folder(self._folder)
            path = self._folder / f"{self._stem}-{instrument.name}-{wave.name}.wav"
            frames, channels = wave.samples.shape
            with AudioWriter(path, rate=round(self._rate), channels=channels, subtype="float", frames_expected=frames,
                             overwrite=self._force) as writer:
                writer.write(wave.samples)
            written.append(path)
        for document in instrument.documents(result) if self._folder is not None else ():
            assert self._folder is not None, "without a folder nothing is written"
            make_folder(self._folder)
            path = self._folder / f"{self._stem}-{instrument.name}-{document.name}"
            write_text_atomic(path, document.text, overwrite=self._force)
            written.append(path)
        return written
