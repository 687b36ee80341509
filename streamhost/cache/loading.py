"""From generated text to a module: compiled now, or taken from disk."""

import contextlib
import hashlib
import linecache
import sys
import threading
from collections.abc import Iterator
from types import ModuleType

from streamhost.cache.folder import add_notice, kernel_folder
from streamhost.cache.kernel import Kernel, alone, in_use, place
from streamhost.cache.pruning import prune_daily

CONTRACT = 1  # raised when what the loader promises to a generated text changes

# numba's settings that change machine code and are not in numba's own cache index
CODE_SETTINGS = (
    "OPT",
    "LOOP_VECTORIZE",
    "SLP_VECTORIZE",
    "BOUNDSCHECK",
    "ENABLE_AVX",
    "DISABLE_INTEL_SVML",
    "CPU_NAME",
    "CPU_FEATURES",
    "DEBUGINFO_DEFAULT",
    "EXTEND_VARIABLE_LIFETIMES",
    "LLVM_REFPRUNE_PASS",
    "LLVM_REFPRUNE_FLAGS",
    "DISABLE_JIT",
)

_modules: dict[str, ModuleType] = {}
_loading = threading.Lock()


def load_module(source: str, tag: str) -> ModuleType:
    """The module that `source` makes, compiled or taken from disk; one module per text and process.

    source: generated text that keeps the agreement in this package's docstring. tag: what a notice and a traceback
    call it, for people; not part of the key. Safe from several threads and several processes at once. What the text
    itself raises (a mistake of ours, never the user's) comes through unchanged.
    """
    key = _key(source)
    with _loading:
        if key not in _modules:
            _modules[key] = _load(source, key, tag)
        return _modules[key]


def _key(source: str) -> str:
    import llvmlite
    import numba
    import numpy

    settings = [f"{name}={getattr(numba.config, name, None)!r}" for name in CODE_SETTINGS]
    versions = [str(CONTRACT), numba.__version__, numpy.__version__, llvmlite.__version__]
    return hashlib.sha256("\0".join([source, *versions, *settings]).encode()).hexdigest()[:32]


def _load(source: str, key: str, tag: str) -> ModuleType:
    folder = kernel_folder()
    if folder is None:
        return _load_in_memory(source, key, tag)
    try:
        return _load_from_disk(Kernel(folder, key), source)
    except Exception as problem:  # on a bad file or a full disk numba raises nearly anything
        module = _load_in_memory(source, key, tag)
        add_notice(f"The kernel {tag} was compiled without the disk cache in {folder}: {problem!r}.")
        return module


def _load_in_memory(source: str, key: str, tag: str) -> ModuleType:
    path = f"<streamhost {tag} {key}>"
    linecache.cache[path] = (len(source), None, source.splitlines(keepends=True), path)
    return _run(source, key, path, cache=False)


def _load_from_disk(kernel: Kernel, source: str) -> ModuleType:
    in_use.add(kernel.key)
    place(kernel.text, source.encode())
    module = _run_sealed(kernel, source)
    if module is None:
        with alone(kernel.text):
            # whoever held the lock before us may have done the work
            module = _run_sealed(kernel, source) or _compile_and_seal(kernel, source)
        prune_daily(kernel.folder.parent)
    return module


def _run_sealed(kernel: Kernel, source: str) -> ModuleType | None:
    if not kernel.is_sealed():
        return None
    try:
        module = _run(source, kernel.key, str(kernel.text), cache=True)
    except Exception:  # sealed and yet unreadable: it will be compiled again
        return None
    kernel.mark_used()
    return module


def _compile_and_seal(kernel: Kernel, source: str) -> ModuleType:
    kernel.drop_compiled()
    module = _run(source, kernel.key, str(kernel.text), cache=True)
    kernel.put_seal()
    return module


def _run(source: str, key: str, path: str, cache: bool) -> ModuleType:
    module = ModuleType(f"streamhost_kernel_{key}")
    vars(module).update(__file__=path, CACHE=cache)
    # numba looks the module up by name when it reads machine code back, so it must be there first
    sys.modules[module.__name__] = module
    try:
        with _numba_writes_beside_the_text():
            exec(compile(source, path, "exec", dont_inherit=True), vars(module))
    except BaseException:
        del sys.modules[module.__name__]
        raise
    return module


@contextlib.contextmanager
def _numba_writes_beside_the_text() -> Iterator[None]:
    """NUMBA_CACHE_DIR and its like would send the machine code to a folder that we have not checked."""
    from numba import config

    kept = {name: getattr(config, name, "") for name in ("CACHE_DIR", "CACHE_LOCATOR_CLASSES")}
    try:
        for name in kept:
            setattr(config, name, "")
        yield
    finally:
        for name, value in kept.items():
            setattr(config, name, value)
