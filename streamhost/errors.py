"""The errors that users meet.

Each message is one clear paragraph: what, which value, which place, what is allowed. `exit_status` is what the
command line returns: 2 where the request is wrong, 3 where the machine failed us.
"""

from collections.abc import Iterable


class StreamhostError(Exception):
    """Base of everything that a user may want to catch."""

    exit_status = 2


class RequestError(StreamhostError, ValueError):
    """What was asked for cannot be done as asked."""


class FilterError(RequestError):
    """A filter that cannot be: bad coefficients, bad parameters, unstable as asked."""


class DiagramError(RequestError):
    """A diagram that breaks a rule of signal-flow graphs."""


class FormatError(RequestError):
    """A word, rounding, overflow or arithmetic that cannot be; `problems` lists every (key, message) found."""

    def __init__(self, message: str, problems: Iterable[tuple[str, str]] = ()) -> None:
        self.problems = tuple(problems)
        super().__init__(message)


class StructureError(RequestError):
    """A form or decomposition that does not exist or cannot carry the filter; `reason`: a clause that says why not."""

    def __init__(self, message: str, reason: str = "") -> None:
        self.reason = reason
        super().__init__(message)


class AudioFileError(RequestError):
    """A file that is not the audio that was asked for."""


class PresetError(RequestError):
    """A preset with one or more mistakes; `problems` lists them all."""

    def __init__(self, problems: Iterable[str]) -> None:
        self.problems = tuple(problems)
        super().__init__("\n".join(self.problems))


class MachineError(StreamhostError, OSError):
    """The machine failed us: disk, device, permission."""

    exit_status = 3


def nearest(name: str, allowed: Iterable[str]) -> str:
    """' Did you mean "…"?' for a misspelt name, or an empty string."""
    from difflib import get_close_matches

    close = get_close_matches(name, list(allowed), n=1, cutoff=0.6)
    return f' Did you mean "{close[0]}"?' if close else ""
