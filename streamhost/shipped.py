"""Where the presets, the recordings and the example of a core that ship with the program are."""

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Literal

from streamhost.errors import AudioFileError, PresetError, nearest

Kind = Literal["preset", "sample", "core"]


@dataclass(frozen=True)
class _Shipped:
    in_repository: str
    in_package: str
    extensions: tuple[str, ...]
    what: str
    without: str = ""


_KINDS: dict[Kind, _Shipped] = {
    "preset": _Shipped("presets", "presets_shipped", (".toml",), "preset", without="cores"),
    "sample": _Shipped("audio_samples", "audio_samples", (".wav", ".flac"), "recording"),
    "core": _Shipped("presets/cores", "presets_shipped/cores", (".toml",), "core"),
}


def folder(kind: Kind) -> Path:
    """Inside an installed package; at the root of the repository where the package is used from there."""
    shipped, package = _KINDS[kind], Path(__file__).parent
    installed = package / shipped.in_package
    return installed if installed.is_dir() else package.parent / shipped.in_repository


def names(kind: Kind) -> list[str]:
    """The shipped names, sorted, without extension; those in sub-folders as "folder/name"."""
    return [file.relative_to(folder(kind)).with_suffix("").as_posix() for file in _files(kind)]


def resolve(name: str | Path, kind: Kind) -> Path:
    """The file that the user means: a path as given if it exists, else the shipped one of that name.

    A shipped name is given with or without its extension and its sub-folder. Raises PresetError or AudioFileError for
    a name that is neither, or that several shipped files share.
    """
    path = Path(name)
    if path.is_file():
        return path
    found = [file for file in _files(kind) if _answers_to(file, path.as_posix(), kind)]
    if len(found) == 1:
        return found[0]
    if path.exists():
        return path
    raise _refusal(str(name), kind, found)


def _answers_to(file: Path, name: str, kind: Kind) -> bool:
    relative = file.relative_to(folder(kind))
    return name in (relative.as_posix(), relative.with_suffix("").as_posix(), file.name, file.stem)


def _files(kind: Kind) -> list[Path]:
    shipped, inside = _KINDS[kind], folder(kind)
    return sorted(file for file in inside.rglob("*")
                  if file.suffix in shipped.extensions and file.relative_to(inside).parts[0] != shipped.without)


def _refusal(name: str, kind: Kind, found: Sequence[Path]) -> PresetError | AudioFileError:
    if found:
        several = ", ".join(file.relative_to(folder(kind)).as_posix() for file in found)
        message = f"{name}: several shipped files have this name: {several}. Give the whole name of one."
    else:
        stem = name.removesuffix(Path(name).suffix)
        hint = nearest(stem, names(kind)) or f" Shipped are: {', '.join(names(kind)) or 'none'}."
        message = f"{name}: there is no such file, and no shipped {_KINDS[kind].what} of this name.{hint}"
    return AudioFileError(message) if kind == "sample" else PresetError([message])
