"""All that is known here of PortAudio and of the package that serves it.

The compiled step is opened as the callback itself through the package's base class, which is documented for this and yet
private by its name; where that is refused, a Python callback makes the one call.
"""

import contextlib
import ctypes
from collections.abc import Iterator
from dataclasses import dataclass
from types import ModuleType
from typing import Any, Literal

from streamhost.errors import MachineError
from streamhost.host.step import SIGNATURE

Callback = Literal["compiled", "python"]

NO_LIBRARY = (
    "PortAudio, through which sound cards are served, was not found. Install it (on Debian: sudo apt install libportaudio2), "
    "or run without a sound card by --no-device."
)
OTHERWISE = "streamhost listen --devices tells what there is; --no-device runs without a sound card."


@dataclass(frozen=True)
class Wanted:
    """A stream as asked for. A device is a name, a part of one, or a number; None: the system's own.

    `inputs` 0: playback only, else duplex, from `input_device` (None: the same device). `latency_s`: seconds, "low" or "high",
    as the device has them.
    """

    rate: float
    block: int
    outputs: int
    inputs: int = 0
    device: str | int | None = None
    input_device: str | int | None = None
    latency_s: float | Literal["low", "high"] = 0.02
    callback: Callback = "compiled"


@dataclass(frozen=True)
class Opened:
    """A stream as it is. `latency_s`: from the step to the card, as PortAudio tells it."""

    device: str
    input_device: str
    latency_s: float
    callback: Callback


@dataclass(frozen=True)
class Found:
    """A device. `preferred`: the system's own choice."""

    number: int
    name: str
    host: str
    inputs: int
    outputs: int
    rate: float
    preferred: bool


def library() -> ModuleType:
    """The package. MachineError where PortAudio is not there."""
    try:
        import sounddevice
    except OSError as problem:
        raise MachineError(NO_LIBRARY) from problem
    module: ModuleType = sounddevice
    return module


def rescan() -> None:
    """Look for devices again, which PortAudio does only as it begins. No stream may be open."""
    with contextlib.suppress(AttributeError):
        library()._terminate()
        library()._initialize()


def devices() -> list[Found]:
    """All that PortAudio lists."""
    sound = library()
    hosts = sound.query_hostapis()
    preferred = {host["default_output_device"] for host in hosts} | {host["default_input_device"] for host in hosts}
    return [
        Found(number, each["name"], hosts[each["hostapi"]]["name"], each["max_input_channels"], each["max_output_channels"],
              each["default_samplerate"], number in preferred)
        for number, each in enumerate(sound.query_devices())
    ]


class Stream:
    """A stream that runs the step at `step` on the HOST record at `host`, from its opening on.

    Both must live until it is closed. Raises MachineError with what PortAudio has against it.
    """

    def __init__(self, wanted: Wanted, step: int, host: int) -> None:
        sound = library()
        with told(wanted):
            if not any(each["max_output_channels"] for each in sound.query_devices()):
                raise MachineError(f"There is no sound card to play on. {OTHERWISE}")
            self._stream, callback = _open(sound, wanted, step, host)
            self._stream.start()
            self.opened = self._facts(wanted, callback)

    @property
    def is_running(self) -> bool:
        """False once the device has gone. A device that stands still counts as running."""
        try:
            return bool(self._stream.active)
        except Exception:  # PortAudioError, of a module that may not be there
            return False

    def close(self, *, played: bool) -> None:
        """End it; `played`: after what is on its way to the card has been heard."""
        with contextlib.suppress(Exception):
            if played:
                self._stream.stop(ignore_errors=True)
            else:
                self._stream.abort(ignore_errors=True)
        with contextlib.suppress(Exception):
            self._stream.close(ignore_errors=True)

    def _facts(self, wanted: Wanted, callback: Callback) -> Opened:
        stream = self._stream
        name = library().query_devices
        if not wanted.inputs:
            return Opened(name(stream.device)["name"], "", float(stream.latency), callback)
        given, taken = stream.device
        return Opened(name(taken)["name"], name(given)["name"], float(stream.latency[1]), callback)


@contextlib.contextmanager
def told(wanted: Wanted) -> Iterator[None]:
    """What goes wrong at opening, in our words."""
    try:
        yield
    except MachineError:
        raise
    except Exception as problem:  # PortAudioError, and ValueError for names that fit none or several
        named = "the system's own sound card" if wanted.device is None else f'the sound card "{wanted.device}"'
        raise MachineError(
            f"Could not open {named} at {wanted.rate:g} Hz with {wanted.outputs} channels out"
            + (f" and {wanted.inputs} in" if wanted.inputs else "")
            + f", blocks of {wanted.block}: {' '.join(str(problem).split())}. {OTHERWISE}"
        ) from problem


def _open(sound: Any, wanted: Wanted, step: int, host: int) -> tuple[Any, Callback]:
    if wanted.callback == "compiled":
        try:
            address, user = sound._ffi.cast("PaStreamCallback*", step), sound._ffi.cast("void*", host)
            return sound._StreamBase(callback=address, userdata=user, wrap_callback=None, **_parameters(wanted)), "compiled"
        except (AttributeError, TypeError):  # another version of the package
            pass
    kind = sound.RawStream if wanted.inputs else sound.RawOutputStream
    parameters = _parameters(wanted)
    del parameters["kind"]
    return kind(callback=_python_callback(wanted, step, host), **parameters), "python"


def _parameters(wanted: Wanted) -> dict[str, Any]:
    """No dither: what the step gives is what the card gets."""
    duplex = wanted.inputs > 0
    given = wanted.device if wanted.input_device is None else wanted.input_device
    return {
        "kind": "duplex" if duplex else "output", "samplerate": wanted.rate, "blocksize": wanted.block,
        "device": (given, wanted.device) if duplex else wanted.device,
        "channels": (wanted.inputs, wanted.outputs) if duplex else wanted.outputs,
        "dtype": "float32", "latency": wanted.latency_s, "dither_off": True,
    }


def _python_callback(wanted: Wanted, step: int, host: int) -> Any:
    """The one call of the step, from Python."""
    run = SIGNATURE(step)

    def address(buffer: Any) -> int:
        return ctypes.addressof(ctypes.c_char.from_buffer(buffer))

    def playback(out: Any, frames: int, time: Any, status: Any) -> None:
        run(None, address(out), frames, None, _bits(status), host)

    def duplex(given: Any, out: Any, frames: int, time: Any, status: Any) -> None:
        run(address(given), address(out), frames, None, _bits(status), host)

    return duplex if wanted.inputs else playback


def _bits(status: Any) -> int:
    """The gaps that a status tells, as PortAudio numbers them."""
    told = (status.input_underflow, status.input_overflow, status.output_underflow, status.output_overflow)
    return sum(1 << place for place, flag in enumerate(told) if flag)
