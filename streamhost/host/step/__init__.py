"""The compiled step: one block from what comes in to what goes out, in one call of machine code.

A C function with the signature of a sound card's callback, `step(in, out, frames, time, flags, host) -> 0`: `host` is the
address of the HOST record, `in` and `out` are interleaved float32 or float64, as the record says; either may be null. A sound
card, a file and a test clock drive it alike. It allocates nothing, locks nothing and cannot raise.

Its parts beside the core are compiled apart, each `part(host, a, b, c) -> word`, and called by the addresses in the HOST
record: a host that needs none of them, a plain rendering, has none of them compiled.
"""

import ctypes
import hashlib
from dataclasses import dataclass
from functools import cache
from pathlib import Path

from streamhost.cache import load_module
from streamhost.host import records, source_kinds
from streamhost.host.records import ACTION, BANK_FRAMES, BINS, BINS_PER_OCTAVE, CONTROL, HOST_METERS, LOG, MOST_LANES, PARTS
from streamhost.host.step import actions, callback, carries, due, guarding, ideals, lanes, mixing, recording, sources
from streamhost.signals import COSINE_TERMS, SINE_TERMS

SIGNATURE = ctypes.CFUNCTYPE(
    ctypes.c_int32, ctypes.c_void_p, ctypes.c_void_p, ctypes.c_uint64, ctypes.c_void_p, ctypes.c_uint64, ctypes.c_void_p
)
PUBLISH = ctypes.CFUNCTYPE(None, ctypes.c_int64, ctypes.c_int64)
FETCH = ctypes.CFUNCTYPE(ctypes.c_int64, ctypes.c_int64)

RECORDS = ("LANE", "LANE_METERS", "HOST", "HOST_METERS", "CONTROL", "CARRY", "SOURCE", "ACTION", "LOG")

TEXTS = dict(zip(PARTS, (actions, carries, sources, ideals, mixing, guarding, recording), strict=True))

_HEAD = '''"""The compiled step of the host: {name}."""

# addresses as pointers: {pointers}
import numpy as np
from numba import cfunc, njit, types

from streamhost.host.pointers import (
    address_of, call_kernel, call_part, load_acquire, nanoseconds, real, record, set_byte, set_real, set_single, set_word,
    single, store_release, word,
)

U = np.uint64
{records}

# compiled with the functions that carry a signature, and kept on disk as part of them
helper = njit(error_model="numpy", no_cpython_wrapper=True, no_cfunc_wrapper=True)
part = cfunc(types.int64(types.int64, types.int64, types.int64, types.int64), cache=CACHE, error_model="numpy")
'''

_TAIL = '''

@cfunc(types.void(types.int64, types.int64), cache=CACHE, error_model="numpy")
def publish(address, value):
    store_release(address, value)


@cfunc(types.int64(types.int64), cache=CACHE, error_model="numpy")
def fetch(address):
    return load_acquire(address)
'''


@dataclass(frozen=True)
class Step:
    """The compiled step: its machine address, and the object that keeps it alive."""

    address: int
    owner: object

    def __call__(self, given: int | None, wanted: int | None, frames: int, host: int) -> None:
        """Run one block; given, wanted and host are addresses."""
        SIGNATURE(self.address)(given, wanted, frames, None, 0, host)

    def publish(self, address: int, value: int) -> None:
        """Store a word after all that was stored before it."""
        PUBLISH(self.owner.publish.address)(address, value)  # type: ignore[attr-defined]

    def fetch(self, address: int) -> int:
        """Load a word before all that is loaded after it."""
        return int(FETCH(self.owner.fetch.address)(address))  # type: ignore[attr-defined]


def step_source() -> str:
    """The readable source of the core; equal for all hosts."""
    return _source("the core", due.TEXT + "\n" + lanes.TEXT + "\n" + callback.TEXT) + _TAIL


def part_source(name: str) -> str:
    """The readable source of a part."""
    return _source(name, TEXTS[name].TEXT)


def compile_step() -> Step:
    """The core: from this process, from disk, or compiled now."""
    module = load_module(step_source(), "host step")
    return Step(module.step.address, module)


@cache
def compile_part(name: str) -> int:
    """The address of a part, which stays: from this process, from disk, or compiled now."""
    module = load_module(part_source(name), f"host step, {name}")
    address: int = vars(module)[{"record": "keep"}.get(name, name)].address
    return address


def _source(name: str, text: str) -> str:
    pointers = hashlib.sha256(Path(__file__).parents[1].joinpath("pointers.py").read_bytes()).hexdigest()[:16]
    dtypes = "\n".join(f"{record} = np.dtype({getattr(records, record).descr})" for record in RECORDS if record in text)
    return _HEAD.format(name=name, pointers=pointers, records=dtypes) + "\n" + text.format(**_values())


def _values() -> dict[str, object]:
    """What the texts leave open."""
    named = ("HEAR", "BANK", "PLACE", "SUBTRACT", "MUTED", "COMING_UP", "SOUNDING", "SHUT")
    return {
        **{name: place for place, name in enumerate(records.CHANGEOVERS)},
        **source_kinds.NUMBERS,
        **{name: getattr(records, name) for name in named},
        "SOURCE_KIND": records.TAKE_SOURCE, "nothing": records.NOTHING, "most": MOST_LANES,
        "bank_frames": BANK_FRAMES, "bins": BINS_PER_OCTAVE, "all_bins": BINS,
        "log_bytes": LOG.itemsize, "action_bytes": ACTION.itemsize, "done_at": _place(ACTION, "done"),
        "logged_at": _place(HOST_METERS, "logged"), "taken_at": _place(HOST_METERS, "taken"),
        "recorded_at": _place(HOST_METERS, "recorded"), "callbacks_at": _place(HOST_METERS, "callbacks"),
        "drained_at": _place(CONTROL, "drained"),
        "arrays": ", ".join(f"lane.{name}{' + done * channels' if name == 'marks' else ''}" for name in records.ARRAYS),
        "ideal_arrays": ", ".join(f"ideal.{name}" for name in records.ARRAYS),
        "odd": _series("odd", SINE_TERMS), "even": _series("even", COSINE_TERMS),
    }


def _place(record: records.Record, field: str) -> int:
    assert record.fields is not None, "a record has fields"
    return int(record.fields[field][1])


def _series(name: str, terms: list[float]) -> str:
    """A power series in `square`, the last term first, as `signals` adds it up."""
    return "\n".join(f"    {name} = {name} * square + {term!r}" for term in reversed(terms))
