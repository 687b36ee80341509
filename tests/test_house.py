"""The house rules, checked by walking the house itself."""

import ast
import importlib
import inspect
import re
import subprocess
import sys
from collections.abc import Iterator
from fnmatch import fnmatch
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parent.parent
PACKAGE = ROOT / "streamhost"

# A unit is a module or package right under streamhost; it may import from the levels before its own.
LEVELS = (
    {"errors", "cache", "shipped"},
    {"formats", "files", "signals"},
    {"filters", "diagram"},
    {"program", "drawing"},
    {"structures"},
    {"realization"},
    {"presets", "host"},
    {"measure", "live"},
    {"profile"},
    {"report", "page"},
    {"commands"},
)
# Imports between two units of one level, each (importer, imported).
SIDEWAYS = {("cache", "errors"), ("shipped", "errors")}

LONGEST_FILE = 400
LONGEST_FUNCTION = 40
# "file.py" or "file.py:function" -> the reason why it may be longer
ALLOWED_LONGER: dict[str, str] = {}

MODULES = sorted(PACKAGE.rglob("*.py"))


def short(path: Path) -> str:
    return path.relative_to(PACKAGE).as_posix()


def parsed(path: Path) -> ast.Module:
    return ast.parse(path.read_text(encoding="utf-8"), str(path))


def unit_of(path: Path) -> str:
    """The unit that a file belongs to; "" for streamhost/__init__.py, the surface on top of all."""
    first = path.relative_to(PACKAGE).parts[0].removesuffix(".py")
    return "" if first == "__init__" else first


def level_of(unit: str) -> int:
    for number, level in enumerate(LEVELS):
        if unit in level:
            return number
    return len(LEVELS)


# --- import direction


def imported_names(tree: ast.Module, package: tuple[str, ...]) -> Iterator[tuple[int, str]]:
    """Line and full dotted name of each import, wherever it stands; package: that of the file, for relative imports."""
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            yield from ((node.lineno, alias.name) for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            start = package[: len(package) - node.level + 1] if node.level else ()
            module = ".".join([*start, *([node.module] if node.module else [])])
            yield from ((node.lineno, f"{module}.{alias.name}") for alias in node.names)


def wrong_imports(unit: str, tree: ast.Module, package: tuple[str, ...]) -> list[str]:
    """The imports of a file of `unit` that do not run downward, as "line 3: name"."""
    wrong = []
    for line, name in imported_names(tree, package):
        parts = name.split(".")
        if parts[0] != "streamhost":
            continue
        target = parts[1] if len(parts) > 1 and level_of(parts[1]) < len(LEVELS) else ""
        if target == unit or (unit, target) in SIDEWAYS or name == "streamhost.__version__":
            continue
        if level_of(target) >= level_of(unit):
            wrong.append(f"line {line}: {name}")
    return wrong


@pytest.mark.parametrize("path", MODULES, ids=short)
def test_imports_run_downward(path: Path) -> None:
    package = ("streamhost", *path.relative_to(PACKAGE).parts[:-1])
    assert wrong_imports(unit_of(path), parsed(path), package) == []


@pytest.mark.parametrize(
    ("unit", "text", "wrong"),
    [
        ("diagram", "from streamhost.errors import DiagramError", 0),
        ("diagram", "from streamhost.diagram.nodes import Gain", 0),
        ("diagram", "import numpy", 0),
        ("commands", "from streamhost import __version__", 0),
        ("", "from streamhost.commands.main import main", 0),
        ("cache", "from streamhost.errors import MachineError", 0),
        ("diagram", "from streamhost.program import Program", 1),
        ("diagram", "import streamhost.host", 1),
        ("diagram", "from streamhost import host", 1),
        ("diagram", "from streamhost import realize", 1),
        ("diagram", "import streamhost", 1),
        ("diagram", "from streamhost.filters import Filter", 1),
        ("diagram", "def f():\n    from ..structures import forms", 1),
        ("diagram", "from .nodes import Gain", 0),
        ("errors", "from streamhost.cache import prune", 1),
    ],
)
def test_the_import_check_sees_what_it_should(unit: str, text: str, wrong: int) -> None:
    assert len(wrong_imports(unit, ast.parse(text), ("streamhost", unit))) == wrong


def test_every_unit_has_a_level() -> None:
    units = {unit_of(path) for path in MODULES} - {"", "__main__"}
    assert units - set().union(*LEVELS) == set()


# --- size and habits


def code_lines(function: ast.FunctionDef | ast.AsyncFunctionDef) -> int:
    """Lines from `def` to the end without the docstring: what is said to the reader has no price."""
    last = function.end_lineno
    assert last is not None
    lines = last - function.lineno + 1
    first = function.body[0]
    if ast.get_docstring(function) is not None and first.end_lineno is not None:
        lines -= first.end_lineno - first.lineno + 1
    return lines


def functions(path: Path) -> list[ast.FunctionDef | ast.AsyncFunctionDef]:
    return [node for node in ast.walk(parsed(path)) if isinstance(node, ast.FunctionDef | ast.AsyncFunctionDef)]


@pytest.mark.parametrize("path", MODULES, ids=short)
def test_files_and_functions_are_small(path: Path) -> None:
    sizes = [(f"{short(path)}:{function.name}", code_lines(function), LONGEST_FUNCTION) for function in functions(path)]
    sizes.append((short(path), len(path.read_text(encoding="utf-8").splitlines()), LONGEST_FILE))
    too_long = [f"{name}: {lines} lines, {most} allowed" for name, lines, most in sizes if lines > most]
    assert [found for found in too_long if found.rsplit(": ", 1)[0] not in ALLOWED_LONGER] == []


def test_no_exception_from_the_size_rule_outlives_its_need() -> None:
    existing = {short(path) for path in MODULES}
    existing |= {f"{short(path)}:{function.name}" for path in MODULES for function in functions(path)}
    assert set(ALLOWED_LONGER) - existing == set()


def bad_habits(tree: ast.Module, may_print: bool) -> list[str]:
    bad = []
    for node in ast.walk(tree):
        if isinstance(node, ast.ExceptHandler) and node.type is None:
            bad.append(f"line {node.lineno}: bare except")
        calls_print = isinstance(node, ast.Call) and isinstance(node.func, ast.Name) and node.func.id == "print"
        if calls_print and not may_print:
            bad.append(f"line {node.lineno}: print")
    return bad


@pytest.mark.parametrize("path", MODULES, ids=short)
def test_no_print_outside_commands_and_no_bare_except(path: Path) -> None:
    assert bad_habits(parsed(path), may_print=unit_of(path) == "commands") == []


def test_the_checks_on_habits_see_what_they_should() -> None:
    tree = ast.parse("def f():\n    try:\n        print(1)\n    except:\n        pass\n")
    assert sorted(bad_habits(tree, may_print=False)) == ["line 3: print", "line 4: bare except"]
    assert bad_habits(tree, may_print=True) == ["line 4: bare except"]
    function = ast.parse('def f():\n    """One\n    two."""\n    return 1\n').body[0]
    assert isinstance(function, ast.FunctionDef)
    assert code_lines(function) == 2


# --- what is said


@pytest.mark.parametrize("path", MODULES, ids=short)
def test_every_public_module_says_what_it_is(path: Path) -> None:
    private = path.stem.startswith("_") and path.stem not in {"__init__", "__main__"}
    assert private or ast.get_docstring(parsed(path))


def test_every_exported_name_says_what_it_is() -> None:
    streamhost = importlib.import_module("streamhost")
    assert streamhost.__all__
    silent = []
    for name in streamhost.__all__:
        thing = getattr(streamhost, name)
        if inspect.isclass(thing) or inspect.isroutine(thing):
            said = thing.__doc__ or ""
            # a dataclass without a docstring gets its own signature as one
            if not said or said.startswith(f"{name}("):
                silent.append(name)
    assert silent == []


# --- the folder as its reader meets it


def top_level() -> set[str]:
    """What lies in the top folder, without hidden entries and what git ignores."""
    git = ["git", "ls-files", "-z", "--cached", "--others", "--exclude-standard"]
    listed = subprocess.run(git, cwd=ROOT, capture_output=True, text=True)
    if listed.returncode == 0:
        names = {name.split("/")[0] for name in listed.stdout.split("\0") if name}
    else:  # an unpacked archive
        made = ("build", "dist", "*.egg-info", "__pycache__", "compared")
        names = {path.name for path in ROOT.iterdir() if not any(fnmatch(path.name, each) for each in made)}
    return {name for name in names if not name.startswith(".")}


def test_top_level_is_what_the_design_says() -> None:
    design = {"README.md", "DEVELOPERS.md", "pyproject.toml", "streamhost", "tests", "presets", "audio_samples"}
    assert top_level() == design


def test_the_readme_starts_with_its_two_commands() -> None:
    text = (ROOT / "README.md").read_text(encoding="utf-8")
    blocks = re.findall(r"^```[a-z]*\n(.*?)^```$", text, flags=re.MULTILINE | re.DOTALL)
    install, check = (block.strip() for block in blocks[:2])
    assert "pip install" in install
    assert "streamhost" in install
    assert len(install.splitlines()) == 1
    assert check == "tests/run"
    assert (ROOT / "tests" / "run").stat().st_mode & 0o111 == 0o111


# --- the command line starts light


def test_help_needs_nothing_heavy() -> None:
    code = """
import sys
sys.argv = ["streamhost", "--help"]
from streamhost.commands.main import main
try:
    main()
except SystemExit as end:
    assert not end.code, end.code
heavy = {"numba", "llvmlite", "scipy", "soundfile", "sounddevice", "mpmath"}
print("heavy:", sorted(heavy & set(sys.modules)))
"""
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True)
    assert done.returncode == 0, done.stderr
    assert "Usage: streamhost" in done.stdout
    assert done.stdout.splitlines()[-1] == "heavy: []"
