"""The report's folder: a page, the figures as JSON, the audio."""

from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from streamhost.files.folder import atomic_folder, check_new_folder
from streamhost.report.page import GENERATOR

INDEX, FIGURES, AUDIO, DOCUMENTS = "index.html", "figures.json", "audio", "proofs"


def is_report(folder: Path) -> bool:
    """Whether a folder holds a report and nothing else, or nothing, so that it may be replaced."""
    names = {path.name for path in folder.iterdir()}
    if not names:
        return True
    if not names <= {INDEX, FIGURES, AUDIO, DOCUMENTS} or INDEX not in names:
        return False
    with (folder / INDEX).open(encoding="utf-8", errors="replace") as file:
        return f'name="generator" content="{GENERATOR}' in file.read(4096)


def check_report(path: Path, *, force: bool) -> None:
    """RequestError, before any work, where no report can be written."""
    check_new_folder(path, is_report, overwrite=force)


@contextmanager
def report_folder(path: Path, *, force: bool) -> Iterator[Path]:
    """A folder that becomes the report when the block ends well, and otherwise goes; there are
    folders for audio and for documents in it."""
    with atomic_folder(path, is_report, overwrite=force) as folder:
        inside = [folder / AUDIO, folder / DOCUMENTS]
        for place in inside:
            place.mkdir()
        yield folder
        for place in inside:
            if not any(place.iterdir()):
                place.rmdir()
