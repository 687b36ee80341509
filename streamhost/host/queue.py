"""What is prepared for the step: written into a free slot, published by one release store, kept until it is acknowledged."""

import numpy as np

from streamhost.errors import RequestError
from streamhost.host.records import ACTION
from streamhost.host.shared import Shared
from streamhost.host.step import Step


class Queue:
    """Up to `capacity` actions that wait, each due at a frame; of two at one frame the one put first goes first."""

    def __init__(self, step: Step, shared: Shared, capacity: int) -> None:
        self._step, self._shared = step, shared
        self.slots = np.zeros(capacity, ACTION)
        self._tickets = 0
        self._kept: dict[int, tuple[object, ...]] = {}
        self._field = {name: place[1] for name, place in (ACTION.fields or {}).items()}

    def put(self, frame: int, kind: int, *, kept: tuple[object, ...] = (), **fields: int | float) -> int:
        """Publish an action; its ticket. `kept` is not freed before it is done. RequestError where all slots wait."""
        self.tend()
        free = np.flatnonzero(self.slots["ticket"] == 0)
        if not len(free):
            raise RequestError(f"{len(self.slots)} changes wait already, and no more can: let some come due first.")
        slot = int(free[0])
        self._tickets += 1
        entry = self.slots[slot]
        for name in self._field:
            if name != "ticket":
                entry[name] = fields.get(name, 0)
        entry["frame"], entry["kind"] = frame, kind
        self._kept[slot] = kept
        self._step.publish(self._address(slot, "ticket"), self._tickets)
        control = self._shared.control
        control["used"] = max(int(control["used"][0]), slot + 1)
        self._step.publish(control.ctypes.data, self._tickets)
        return self._tickets

    @property
    def waiting(self) -> int:
        """How many are not done yet."""
        return self._tickets - int(self._shared.meters["taken"][0])

    def tend(self) -> None:
        """Free the slots, and what was kept, of what the step has acknowledged."""
        for slot in list(self._kept):
            if self._step.fetch(self._address(slot, "done")):
                del self._kept[slot]
                self.slots[slot]["ticket"] = 0

    def _address(self, slot: int, field: str) -> int:
        return int(self.slots.ctypes.data) + slot * ACTION.itemsize + int(self._field[field])
