"""What pages are sent: the latest picture, made once for all of them, and what is seldom new only where it is."""

import threading
import time
from collections.abc import Callable

import msgspec

from streamhost.host.guard import CAUTION
from streamhost.page.sitting import Sitting
from streamhost.page.snapshot import Document, curves, finite, last_change, ledger, level
from streamhost.page.spectra import Theory
from streamhost.realization import Realization

LEDGER_S, CURVES_S = 0.25, 0.03

NONE = "none"
"""Of floating point, of errors that do not die out, and of lanes that saturate: no noise is predicted of these."""

Draw = Callable[[Realization], tuple[str, str]]


class Pictures:
    """Made for the server's thread, which alone calls `latest`. Drawings and predictions come when they are ready."""

    def __init__(self, sitting: Sitting, draw: Draw) -> None:
        self._sitting, self._draw = sitting, draw
        self._encoder = msgspec.json.Encoder()
        self._ledger: Document = {}
        self._ledger_at = self._curves_at = float("-inf")
        self._latest: Document = {}
        self._change: Document | None = None
        self._known: dict[int, tuple[Theory, str, str]] = {}
        self._studying, self._held = False, 0

    def latest(self, seen: set[object]) -> bytes:
        """The picture of now, as JSON. seen: what this page has been sent of that which is seldom new."""
        now = time.monotonic()
        if self._is_due(now):
            self._ledger, self._ledger_at = self._written(), now
        if now - self._curves_at >= CURVES_S:
            self._latest, self._curves_at = {**self._ledger, "level": level(self._sitting), "curves": self._curves()}, now
        return self._encoder.encode({**self._latest, **self._news(seen)})

    def _is_due(self, now: float) -> bool:
        """Four times a second, and at once where something was done."""
        if now - self._ledger_at >= LEDGER_S:
            return True
        sentence = self._ledger["sentence"]
        assert isinstance(sentence, dict), "it is one"
        return self._ledger["notice"] != self._sitting.notice or sentence["heard"] != self._sitting.heard + 1

    def _written(self) -> Document:
        self._study()
        found = ledger(self._sitting)
        lanes = found["lanes"]
        assert isinstance(lanes, list), "it is one"
        for number, lane in enumerate(lanes):
            known = self._studied(number)
            lane["predicted"] = "" if known is None else _predicted(known[0]) if lane["saturated"] == 0 else NONE
        output = found["output"]
        assert isinstance(output, dict), "it is one"
        if output["state"] == "sounding" and output["held"] > self._held:
            output["state"] = "guard holding"
        self._held = output["held"]
        self._change = last_change(self._sitting) or self._change
        return found

    def _curves(self) -> Document:
        known = self._studied(self._sitting.heard)
        places = [] if known is None else known[0].third_octaves
        return {**curves(self._sitting), "predicted": [[round(place, 2), round(value, 1)] for place, value in places]}

    def _news(self, seen: set[object]) -> Document:
        """What this page has not been sent yet."""
        known, lane, found = self._studied(self._sitting.heard), self._sitting.heard, Document()
        fresh: dict[str, tuple[object, object]] = {"caution": ("caution", CAUTION)}
        if self._change is not None:
            fresh["change"] = (("change", self._change["frame"]), self._change)
        if known is not None:
            fresh["diagram"] = (("diagram", id(known[0])), {"lane": lane + 1, "svg": known[1], "caption": known[2]})
        for name, (mark, value) in fresh.items():
            if mark not in seen:
                seen -= {each for each in seen if isinstance(each, tuple) and each[0] == name}
                seen.add(mark)
                found[name] = value
        return found

    def _studied(self, number: int) -> tuple[Theory, str, str] | None:
        return self._known.get(id(self._sitting.lanes[number]))

    def _study(self) -> None:
        """Draw and predict what is new, in a thread of its own: both may take long."""
        fresh = [lane for lane in self._sitting.lanes if id(lane) not in self._known]
        if not fresh or self._studying:
            return
        self._studying = True

        def work() -> None:
            for lane in fresh:
                theory = Theory(lane.realization)
                assert theory.dbfs is None or theory.third_octaves, "both are worked out here"
                self._known[id(lane)] = (theory, *self._draw(lane.realization))
            self._studying = False

        threading.Thread(target=work, name="drawings", daemon=True).start()


def _predicted(theory: Theory) -> float | str:
    value = None if theory.dbfs is None else finite(theory.dbfs)
    return NONE if value is None else value
