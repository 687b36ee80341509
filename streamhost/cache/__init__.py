"""Compiled kernels on disk.

A generated module is plain text. It is written once, to a file named after the hash of everything its machine
code depends on, and run from there: numba keeps the machine code beside it, and a traceback shows the generated
lines.

What the generated text agrees to:

* Every compiled function carries one explicit signature and the word CACHE: `@cfunc(SIG, cache=CACHE)`,
  `@njit(SIG, cache=CACHE)`. CACHE is a global that the loader sets before the text runs.
* Compile options stand in the text itself and so in its hash; numba's own index ignores them.
* It imports no other generated module: numba does not see changes in functions that come from another file.

numba's files are pickles, so they are read only from a folder that nobody else can write to, and only while the
seal beside them (their SHA-256) holds: a file cut short by a crash is compiled again instead of being believed.
"""

from streamhost.cache.folder import kernel_folder, notice
from streamhost.cache.loading import load_module
from streamhost.cache.pruning import prune

__all__ = ["kernel_folder", "load_module", "notice", "prune"]
