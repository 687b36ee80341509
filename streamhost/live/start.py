"""The first thing an engine process does: see to it that it ends with its parent, whatever it is doing, loading included."""

import os
import select
import signal
import threading


def main(connection: int, memory: int) -> None:
    """The pipe's and the memory's handles. Ctrl-C and a closed terminal are the parent's business."""
    for name in ("SIGINT", "SIGHUP"):
        if hasattr(signal, name):
            signal.signal(getattr(signal, name), signal.SIG_IGN)
    threading.Thread(target=_end_with_parent, args=(connection,), name="parent", daemon=True).start()
    from streamhost.live.engine import run

    run(connection, memory)


def _end_with_parent(connection: int) -> None:
    """The pipe hangs up when the parent has closed it or has ended, however it did."""
    poll = select.poll()
    poll.register(connection, 0)
    while not any(event & (select.POLLHUP | select.POLLERR | select.POLLNVAL) for _, event in poll.poll()):
        pass
    os._exit(0)
