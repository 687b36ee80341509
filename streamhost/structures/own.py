"""Structures of the user's own: forms from a Python file or from an installed package, among the shipped ones.

A file is run as Python, by the name that the user gives on the command line or in a call; nothing that a preset says leads
here. Packages declare forms under the entry point group "streamhost.forms". What goes wrong in them is told with their
file and line.
"""

import re
import sys
import traceback
from collections.abc import Callable, Iterable
from dataclasses import replace
from functools import cache, wraps
from pathlib import Path
from types import ModuleType
from typing import Any, ParamSpec, TypeVar

from streamhost.diagram import Ref
from streamhost.diagram.hints import General
from streamhost.errors import MachineError, RequestError, StreamhostError, StructureError
from streamhost.structures.form import Form, Size
from streamhost.structures.forms import FORMS

GROUP = "streamhost.forms"
NAME = re.compile(r"[a-z][a-z0-9]*(-[a-z0-9]+)*")
MOST_BYTES = 1 << 20

P = ParamSpec("P")
R = TypeVar("R")


def load_structures(path: str | Path) -> tuple[str, ...]:
    """Run a Python file and take up the forms it declares, as FORM or as a list FORMS; returns their names.

    Loaded again, a file's forms replace those it had before. RequestError where there is no such file, StructureError with
    file and line where it fails, declares no form, or takes a name that is taken.
    """
    file = Path(path)
    module = _run(file, _source(file))
    declared = [*_listed(getattr(module, "FORMS", ()), file), *([module.FORM] if hasattr(module, "FORM") else [])]
    if not declared:
        raise StructureError(f"{file}: this file declares no form. It is to say FORM = Form(...), or FORMS = [Form(...), ...].")
    return add_forms(declared, str(file))


def load_installed() -> tuple[str, ...]:
    """Take up the forms of installed packages; returns their names."""
    from importlib.metadata import entry_points

    names: list[str] = []
    for entry in sorted(entry_points(group=GROUP), key=lambda entry: entry.name):
        where = f'entry point "{entry.name}" of {entry.value}'
        try:
            loaded = entry.load()
        except (Exception, SystemExit) as error:
            raise StructureError(f"{where}: {type(error).__name__}: {error}") from error
        names += add_forms([loaded] if isinstance(loaded, Form) else _listed(loaded, where), where)
    return tuple(names)


def add_forms(declared: Iterable[object], origin: str) -> tuple[str, ...]:
    """Take up forms that come from `origin`, in place of those that came from there before."""
    forms = [_checked(form, origin) for form in declared]
    names = [form.name for form in forms]
    for name in names:
        if names.count(name) > 1 or (name in FORMS and FORMS[name].origin != origin):
            raise StructureError(f'{origin}: the name "{name}" is taken. Each form has a name of its own.')
    for name in [name for name, form in FORMS.items() if form.origin == origin]:
        del FORMS[name]
    FORMS.update({form.name: form for form in forms})
    return tuple(names)


def _source(file: Path) -> str:
    try:
        raw = file.read_bytes()
    except (FileNotFoundError, NotADirectoryError):
        raise RequestError(f"{file}: there is no such file. --structures takes a Python file that declares forms.") from None
    except IsADirectoryError:
        raise RequestError(f"{file}: this is a folder. --structures takes a Python file that declares forms.") from None
    except OSError as error:
        raise MachineError(f"{file}: cannot be read: {error.strerror}.") from error
    if len(raw) > MOST_BYTES:
        raise RequestError(f"{file}: {len(raw)} bytes are more than a file of structures has; at most {MOST_BYTES} are read.")
    try:
        text = raw.decode("utf-8")
    except UnicodeDecodeError:
        raise RequestError(f"{file}: this is no text in UTF-8, so no Python file.") from None
    before, nul, _ = text.partition("\0")
    if nul:
        line = before.count("\n") + 1
        raise StructureError(f"{file}, line {line}: a character of value 0 stands here, and a Python file has none.")
    return text


def _run(file: Path, source: str) -> ModuleType:
    module = ModuleType(f"streamhost_own_{re.sub(r'[^0-9A-Za-z]', '_', file.stem)}")
    module.__file__ = str(file)
    sys.modules[module.__name__] = module  # dataclasses look their module up there
    try:
        exec(compile(source, str(file), "exec"), module.__dict__)
    except SyntaxError as error:
        raise StructureError(f"{file}, line {error.lineno}: {error.msg}.") from error
    except (Exception, SystemExit) as error:
        raise StructureError(told(error, str(file))) from error
    return module


def _listed(declared: object, where: object) -> list[object]:
    if isinstance(declared, list | tuple):
        return list(declared)
    raise StructureError(f"{where}: FORMS is a {type(declared).__name__}. It is to be a list of forms.")


def _checked(form: object, origin: str) -> Form:
    """The form, its functions guarded: what goes wrong in them is told with the user's file and line."""
    if not isinstance(form, Form):
        raise StructureError(f"{origin}: a {type(form).__name__} is declared as a form. It is to be a streamhost.Form.")
    if not (isinstance(form.name, str) and NAME.fullmatch(form.name)):
        raise StructureError(
            f"{origin}: a form is named {form.name!r}. A name is of small letters and digits, joined by hyphens."
        )
    if form.begins_with not in ("numerator", "recursion"):
        raise StructureError(
            f'{origin}: form "{form.name}" begins_with {form.begins_with!r}. Allowed are "numerator" and "recursion".'
        )
    guarded: dict[str, Any] = {field: _guarded(function, field, form.name, origin)
                               for field in RETURNED if (function := getattr(form, field)) is not None}
    return replace(form, origin=origin, **guarded)


def _guarded(function: Callable[P, R], field: str, name: str, origin: str) -> Callable[P, R]:
    """A form's function: what it raises, an end of the process too, and what it should not return are the user's mistakes."""
    fits, wanted = RETURNED[field]

    @wraps(function)
    def guarded(*args: P.args, **kwargs: P.kwargs) -> R:
        try:
            result = function(*args, **kwargs)
        except (Exception, SystemExit) as error:
            raise StructureError(f'{told(error, origin)} (form "{name}")') from error
        if fits(result):
            return result
        code = getattr(function, "__code__", None)
        line = f", line {code.co_firstlineno}" if code else ""
        raise StructureError(f'{origin}{line}: {field} of form "{name}" returned {result!r}. It is to return {wanted}.')

    return guarded


def _are_sentences(value: object) -> bool:
    return isinstance(value, tuple | list) and all(isinstance(sentence, str) for sentence in value)


RETURNED: dict[str, tuple[Callable[[object], bool], str]] = {
    "build_section": (lambda value: isinstance(value, Ref), "the node whose value is the section's output"),
    "carries": (lambda value: isinstance(value, str), 'a string, "" for a section that the form can carry'),
    "hazards": (_are_sentences, "a tuple of sentences, () where there is nothing to say"),
    "size": (lambda value: isinstance(value, Size), "a Size"),
    "exact_size": (lambda value: isinstance(value, Size), "a Size"),
    "general": (lambda value: value is None or isinstance(value, General), "a General, or None for a section that is drawn"),
}
"""The functions of a form, whether something is what they are to return, and that in words."""


def told(error: BaseException, file: str) -> str:
    """What went wrong, with the last line of the user's file that led there."""
    lines = [frame.lineno for frame in traceback.extract_tb(error.__traceback__) if frame.filename == file]
    place = f"{file}, line {lines[-1]}" if lines else file
    said = str(error) if isinstance(error, StreamhostError) else f"{type(error).__name__}: {error}"
    return f"{place}: {said}"


@cache
def installed() -> tuple[str, ...]:
    """The forms of installed packages, taken up once."""
    return load_installed()
