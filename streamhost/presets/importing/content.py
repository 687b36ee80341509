"""From a file to what it states: which reader it needs is found from what it holds, never from its name."""

import re
from pathlib import Path

from streamhost.errors import RequestError
from streamhost.files.atomic import machine_error
from streamhost.presets.importing import npz
from streamhost.presets.importing.c_source import has_braces, read_c
from streamhost.presets.importing.json_text import read_json
from streamhost.presets.importing.stated import Reading
from streamhost.presets.importing.text import read_text

LARGEST_BYTES = 1_000_000
_SINGLE_ARRAY = b"\x93NUMPY"
_JSON = re.compile(r"\s*(\[|\{\s*[\"}])")


def read(path: Path) -> Reading:
    """What the file states. RequestError where it states no coefficients, MachineError where it cannot be read."""
    content = _content(path)
    if content.startswith(npz.SIGNATURE):
        return npz.read_npz(content)
    if content.startswith(_SINGLE_ARRAY):
        raise RequestError("the file is a single NumPy array, which does not say what it is. Save it under its name, sos, in "
                           "an archive: numpy.savez(file, sos=array).")
    text = _text(content)
    if _JSON.match(text):
        return read_json(text)
    return read_c(text) if has_braces(text) else read_text(text)


def _content(path: Path) -> bytes:
    try:
        with path.open("rb") as file:
            content = file.read(LARGEST_BYTES + 1)
    except FileNotFoundError:
        raise RequestError("there is no such file.") from None
    except (IsADirectoryError, NotADirectoryError):
        raise RequestError("this is a folder, or lies inside a file; a file is imported.") from None
    except ValueError:
        raise RequestError("no file has such a name.") from None
    except OSError as error:
        raise machine_error("read", path, error) from error
    if len(content) > LARGEST_BYTES:
        raise RequestError(f"the file is larger than {LARGEST_BYTES // 1_000_000} MB, which no table of coefficients is.")
    return content


def _text(content: bytes) -> str:
    try:
        text = content.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = content.count(b"\n", 0, error.start) + 1
        raise RequestError(f"line {line}: the file is no text in UTF-8: the byte 0x{content[error.start]:02X} is none. Numbers "
                           "are read from text and from NumPy archives.") from None
    return text.replace("\r\n", "\n").replace("\r", "\n")
