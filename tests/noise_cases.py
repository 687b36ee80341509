"""Predicted noise against measured noise, over forms, words and filters."""

from collections.abc import Iterator
from dataclasses import dataclass
from functools import cache

from streamhost import Filter, Fixed, design, realize
from streamhost.errors import FormatError, StructureError
from streamhost.measure import measure
from streamhost.realization import Realization
from streamhost.signals import white

RATE = 48000
SECONDS = 6
SEED = 1
PEAK_DBFS = -20.0
ALLOWED_DB = 0.3
WORDS = ("Q1.15", "Q1.23")
RECURSIVE = ("low-pass 1 kHz", "low-pass 100 Hz", "notch 50 Hz", "peak 1 kHz", "elliptic 4")
FINITE = ("symmetric 21", "antisymmetric 20", "taps 9", "moving average 16", "low-pass 41")


@cache
def filter_named(name: str) -> Filter:
    if name in FINITE:
        return _finite(name)
    if name == "elliptic 4":
        return design("elliptic", rate=RATE, response="low-pass", order=4, frequency=2000, ripple_db=0.5, stopband_db=50)
    kind, value, unit = name.split()
    frequency = float(value) * (1000.0 if unit == "kHz" else 1.0)
    return design(kind, rate=RATE, frequency=frequency, **({"q": 5.0} if kind == "notch" else {"q": 0.707}),
                  **({"gain_db": 6.0} if kind == "peak" else {}))


def _finite(name: str) -> Filter:
    import numpy as np

    rng = np.random.default_rng(SEED)
    if name == "moving average 16":
        return design("moving-average", rate=RATE, length=16)
    kind, length = name.rsplit(" ", 1)
    taps = rng.uniform(-0.3, 0.3, int(length))
    if kind == "low-pass":
        k = np.arange(int(length)) - (int(length) - 1) / 2
        taps = 0.2 * np.sinc(0.2137 * k) * np.hanning(int(length) + 2)[1:-1]
    sign = {"symmetric": 1.0, "antisymmetric": -1.0}.get(kind)
    if sign is not None:
        taps = (taps + sign * taps[::-1]) / 2
    return Filter.from_coefficients(taps.tolist(), rate=RATE)


@dataclass(frozen=True)
class Case:
    """holds: None where there is no verdict; `reason` for that or for no."""

    form: str
    filter: str
    word: str
    measured: float | None
    interval: float | None
    predicted: float | None
    holds: bool | None
    reason: str

    @property
    def off(self) -> float | None:
        if self.measured is None or self.predicted is None:
            return None
        return self.measured - self.predicted

    @property
    def agrees(self) -> bool:
        return self.off is not None and abs(self.off) <= max(ALLOWED_DB, self.interval or 0.0)


def made(form: str, filter: str, word: str) -> Realization | str:
    """The realization, a finite one whole, scaled by the l2 norm where that can be; or why not."""
    reason = ""
    for scaling in ("l2", "none"):
        try:
            return realize(
                filter_named(filter), form=form, scaling=scaling, decomposition="whole" if filter in FINITE else "cascade",
                format=Fixed(word, coefficients={"bits": 32, "point": "coefficient"}),
            )
        except StructureError as error:
            if error.reason:
                return error.reason
            reason = str(error)
        except FormatError as error:
            reason = str(error).split(". ")[0]
    return reason


def case(form: str, filter: str, word: str) -> Case | None:
    """None where the form does not carry the filter."""
    realization = made(form, filter, word)
    if isinstance(realization, str):
        return None
    found = measure(realization, white(SECONDS * RATE, 1, SEED, PEAK_DBFS), (20.0, 20000.0))
    noise, prediction = found.noise, found.prediction
    reason = noise.reason or found.white.reason
    predicted = prediction.dbfs if prediction is not None else None
    return Case(form, filter, word, noise.dbfs, noise.interval_db, predicted, found.white.holds, reason)


def cases(forms: tuple[str, ...]) -> Iterator[Case]:
    """Of each form its five filters: recursive ones, or where it carries none of these, finite ones."""
    for form in forms:
        carried = [name for name in RECURSIVE if not isinstance(made(form, name, WORDS[0]), str)] or list(FINITE)
        for name in carried:
            for word in WORDS:
                if (found := case(form, name, word)) is not None:
                    yield found
