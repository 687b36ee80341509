"""How large signals become at the points that scaling looks at, for any set of sections before them."""

from functools import cache
from math import log2

import numpy as np

from streamhost.filters.roots import roots
from streamhost.structures.division import Sections
from streamhost.structures.form import Half
from streamhost.structures.quadrature import FloatArray, Samples

GONE = 1e-12
MOST_FRAMES = 1 << 18


class Levels:
    """The factors by which a scaling makes what is rounded in a section louder at the output.

    The norm of a point depends on which sections stand before it, not on their order. Good to what a choice between
    orders needs; the scaling itself is made from better norms.
    """

    def __init__(self, sections: Sections, gain: float, samples: Samples, scaling: str, begins_with: Half) -> None:
        self.sections, self.gain, self.samples, self.begins_with = sections, abs(gain), samples, begins_with
        self.kind, _, self.shifted = scaling.partition("-")
        self.norm = cache(self._norm)

    def to_output(self, before: frozenset[int], k: int) -> float:
        """Of section k behind some others; the output of the last section is the output itself."""
        if self.kind == "none" or (self.begins_with == "numerator" and len(before) + 1 == len(self.sections)):
            return 1.0
        norm = self.norm(before | {k}, None) if self.begins_with == "numerator" else self.norm(before, k)
        return self.gain * (2.0 ** round(log2(norm)) if self.shifted else norm)

    def _norm(self, sections: frozenset[int], recursion: int | None) -> float:
        """From the input through some sections, and through 1 / A of another where that is given."""
        if self.kind == "l1":
            return float(np.abs(self._response(sections, recursion)).sum())
        squared = self.samples.whole[sorted(sections)].prod(axis=0)
        if recursion is not None:
            squared = squared * self.samples.recursion[recursion]
        return float(np.sqrt(squared.max())) if self.kind == "linf" else float(np.sqrt(self.samples.power(squared)))

    def _response(self, sections: frozenset[int], recursion: int | None) -> FloatArray:
        from scipy.signal import lfilter

        h = np.eye(1, self._frames)[0]
        for k in sorted(sections):
            h = lfilter(self.sections[k].b, self.sections[k].a, h)
        response: FloatArray = lfilter([1.0], self.sections[recursion].a, h) if recursion is not None else h
        return response

    @property
    def _frames(self) -> int:
        slowest = max((abs(pole) for section in self.sections for pole in roots(section.a)), default=0.0)
        return min(MOST_FRAMES, 64 + int(np.log(GONE) / np.log(slowest))) if slowest > 0.0 else 64
