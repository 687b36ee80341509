"""The devices that there are, asked for in a process of its own: PortAudio may chatter, and wait for a server for ever."""

import json
import subprocess
import sys
from dataclasses import asdict

from streamhost.errors import MachineError
from streamhost.live.portaudio import Found, devices

PATIENCE_S = 10.0
_START = "import sys; sys.path[:] = {path!r}; from streamhost.live.listing import main; main()"


def found_devices() -> list[Found]:
    """All that PortAudio lists. MachineError where it is not there or does not answer."""
    start = _START.format(path=sys.path)
    try:
        done = subprocess.run([sys.executable, "-c", start], stdin=subprocess.DEVNULL, capture_output=True, text=True,
                              timeout=PATIENCE_S)
    except subprocess.TimeoutExpired:
        raise MachineError("The sound system does not answer. --no-device runs without it.") from None
    if done.returncode != 0:
        raise MachineError(f"The sound cards cannot be listed: {done.stderr.strip().splitlines()[-1:]}")
    answer = json.loads(done.stdout)
    if "problem" in answer:
        raise MachineError(answer["problem"])
    return [Found(**each) for each in answer["devices"]]


def main() -> None:
    """Of the process: one line of JSON."""
    try:
        answer: dict[str, object] = {"devices": [asdict(each) for each in devices()]}
    except MachineError as problem:
        answer = {"problem": str(problem)}
    sys.stdout.write(json.dumps(answer) + "\n")
