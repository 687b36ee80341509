"""What every test shares: a kernel cache of the tests' own, and laws that are tried on the same examples every time."""

import importlib
import os
import pkgutil
import signal
import threading
from pathlib import Path

import pytest
from hypothesis import settings

import streamhost
from streamhost.files import AudioWriter
from streamhost.signals import white

ROOT = Path(__file__).resolve().parent.parent

# Kept from run to run, since compiling is most of the tests' time; ignored by git with the rest of pytest's folder.
# Set before any worker or child process starts, so that all of them share it.
os.environ.setdefault("STREAMHOST_CACHE", str(ROOT / ".pytest_cache" / "streamhost"))

# No test is timed. `pytest --hypothesis-profile=explore` looks further than the fixed examples.
settings.register_profile("fixed", deadline=None, derandomize=True, database=None)
settings.register_profile("explore", deadline=None, max_examples=2000, print_blob=True)
settings.load_profile("fixed")

# Hypothesis draws from the constants of the modules that are loaded: all of them, whichever tests ran before.
for module in pkgutil.walk_packages(streamhost.__path__, "streamhost."):
    importlib.import_module(module.name)

# A run in the background of a script starts with Ctrl-C ignored, and so would every process that the tests interrupt.
if threading.current_thread() is threading.main_thread():
    signal.signal(signal.SIGINT, signal.default_int_handler)


@pytest.fixture(scope="session")
def report(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The folder of a report of a comparison, for all who only look at it."""
    from report_examples import compared, quick

    with pytest.MonkeyPatch.context() as patch:
        quick(patch)
        return compared(tmp_path_factory.mktemp("report"))


@pytest.fixture
def recording(tmp_path):
    """Two seconds of noise in two channels, at 48 kHz."""
    path = tmp_path / "noise.wav"
    with AudioWriter(path, rate=48000, channels=2, subtype="pcm24") as writer:
        writer.write(white(2 * 48000, 2, 5, -20.0))
    return str(path)
