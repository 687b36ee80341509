"""L1 norms and peaks from the input of a cascade to the points that scaling looks at."""

import numpy as np

from streamhost.diagram import Builder, Ref, minus
from streamhost.diagram.norms import norms_from_input
from streamhost.filters import Polynomials
from streamhost.structures.division import Sections
from streamhost.structures.form import Half


def norms_of_points(sections: Sections, norm: str, begins_with: Half) -> list[float]:
    """`norm`: "l1" or "linf", rounded to 24 significant bits; the point is each section's output, or its recursion alone.

    Sections are drawn in series as transposed ones, whose nodes stay small, and each recursion beside them.
    """
    builder = Builder()
    signal = builder.input()
    points: list[Ref] = []
    for number, section in enumerate(sections, 1):
        if begins_with == "recursion":
            points.append(_drawn(builder, Polynomials((1.0,), section.a), signal))
        if begins_with == "numerator" or number < len(sections):
            signal = _drawn(builder, section, signal)
        if begins_with == "numerator":
            points.append(signal)
    for number, point in enumerate(points):
        builder.output(point, f"point {number}")
    diagram = builder.build()
    found = norms_from_input(diagram, nodes=diagram.outputs)
    return [float(np.float32(value)) for value in (found.l1 if norm == "l1" else found.peak)]


def _drawn(builder: Builder, section: Polynomials, x: Ref) -> Ref:
    b, a = section.b, section.a
    delays = [builder.delay() for _ in range(max(len(a), len(b)) - 1)]
    y = builder.sum(builder.gain(x, "b", b[0]), *delays[:1])
    for k, delay in enumerate(delays, 1):
        terms = [builder.gain(x, "b", b[k])] if k < len(b) else []
        feedback = [minus(builder.gain(y, "a", a[k]))] if k < len(a) else []
        delay.takes(builder.sum(*terms, *feedback, *delays[k : k + 1]))
    return y
