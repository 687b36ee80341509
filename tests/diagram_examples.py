"""Small diagrams built by hand for the tests of the diagram package; coefficients in powers of z^-1, a[0] = 1."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import ArrayLike

from streamhost.diagram import Builder, Diagram, Ref, minus


def direct_1(b: Sequence[float], a: Sequence[float]) -> Diagram:
    """y = b0 x + b1 x1 + ... - a1 y1 - ..., delays for both."""
    builder = Builder()
    past = [builder.input()]
    for i in range(1, len(b)):
        past.append(builder.delay(f"x{i}", past[-1]))
    fed_back = [builder.delay(f"y{i}") for i in range(1, len(a))]
    terms = [builder.gain(ref, f"b{i}", b[i]) for i, ref in enumerate(past)]
    negative = [minus(builder.gain(ref, f"a{i}", a[i], feedback=True)) for i, ref in enumerate(fed_back, start=1)]
    y = builder.sum(*terms, *negative, label="y")
    for delay, source in zip(fed_back, [y, *fed_back], strict=False):
        delay.takes(source)
    builder.output(y)
    return builder.build()


def transposed_2(b: Sequence[float], a: Sequence[float]) -> Diagram:
    """Of order 2: y = b0 x + s1; s1 = b1 x - a1 y + s2; s2 = b2 x - a2 y."""
    builder = Builder()
    x, d1, d2 = builder.input(), builder.delay("d1"), builder.delay("d2")
    y = builder.sum(builder.gain(x, "b0", b[0]), d1, label="y")
    d1.takes(builder.sum(builder.gain(x, "b1", b[1]), minus(builder.gain(y, "a1", a[1])), d2, label="s1"))
    d2.takes(builder.sum(builder.gain(x, "b2", b[2]), minus(builder.gain(y, "a2", a[2])), label="s2"))
    builder.output(y)
    return builder.build()


def direct_2(b: Sequence[float], a: Sequence[float]) -> Diagram:
    """w = x - a1 w1 - ...; y = b0 w + b1 w1 + ...; b and a of equal length."""
    builder = Builder()
    x, past = builder.input(), [builder.delay(f"w{i}") for i in range(1, len(a))]
    w = builder.sum(x, *(minus(builder.gain(ref, f"a{i}", a[i])) for i, ref in enumerate(past, start=1)), label="w")
    y = builder.sum(*(builder.gain(ref, f"b{i}", b[i]) for i, ref in enumerate([w, *past])), label="y")
    for delay, source in zip(past, [w, *past], strict=False):
        delay.takes(source)
    builder.output(y)
    return builder.build()


def coupled(radius: float, angle: float) -> Diagram:
    """The coupled form's pole core: u = c u1 - s v1 + x, v = s u1 + c v1, sums labelled u and v."""
    builder = Builder()
    c, s = radius * np.cos(angle), radius * np.sin(angle)
    x, u1, v1 = builder.input(), builder.delay("u1"), builder.delay("v1")
    u = builder.sum(builder.gain(u1, "c", c), minus(builder.gain(v1, "s", s)), x, label="u")
    v = builder.sum(builder.gain(u1, "s", s), builder.gain(v1, "c", c), label="v")
    u1.takes(u)
    v1.takes(v)
    builder.output(v)
    return builder.build()


def running_sum(length: int, gain: float | None = None) -> Diagram:
    """y = x - x[n-L] + y1, and a common coefficient after it where there is one."""
    builder = Builder()
    x, y1 = builder.input(), builder.delay("y1")
    y = builder.sum(x, minus(builder.delay("line", x, length)), y1, label="y", grow=(length - 1).bit_length())
    y1.takes(y)
    builder.output(y if gain is None else builder.gain(y, "b", gain))
    return builder.build()


def fir(h: ArrayLike, fold: str | None = None) -> Diagram:
    builder = Builder()
    builder.output(builder.taps(builder.input(), "h", list(np.asarray(h, dtype=np.float64)), fold=fold))
    return builder.build()


def all_pole_lattice(k: Sequence[float]) -> Diagram:
    """Two multiplications a stage: f[m-1] = f[m] - k[m] g[m-1] z^-1, g[m] = k[m] f[m-1] + g[m-1] z^-1.

    Built from the last stage to the first; the output is f[0] = g[0].
    """
    builder = Builder()
    f = builder.input()
    delays = [builder.delay(f"g{m}") for m in range(len(k))]
    upper: Ref | None = None
    for m in range(len(k), 0, -1):
        f = builder.sum(f, minus(builder.gain(delays[m - 1], f"k{m}", k[m - 1])), label=f"f{m - 1}")
        g = builder.sum(builder.gain(f, f"k{m}", k[m - 1]), delays[m - 1], label=f"g{m}")
        if upper is not None:
            upper.takes(g)
        else:
            builder.output(g, "all-pass")
        upper = delays[m - 1]
    assert upper is not None
    upper.takes(f)
    builder.output(f)
    return builder.build()


def node(diagram: Diagram, label: str) -> int:
    """The first node of that label."""
    return next(i for i, n in enumerate(diagram.nodes) if n.label == label)


def second_order(radius: float, angle: float) -> list[float]:
    """1 - 2 r cos(angle) z^-1 + r^2 z^-2."""
    return [1.0, -2.0 * radius * float(np.cos(angle)), radius**2]


def cookbook_low_pass(frequency: float, rate: float = 48000.0, q: float = 0.5**0.5) -> tuple[list[float], list[float]]:
    """W3C Audio Working Group Note 'Audio EQ Cookbook' (2021), LPF: b and a divided by a0."""
    w = 2.0 * np.pi * frequency / rate
    alpha, c = np.sin(w) / (2.0 * q), np.cos(w)
    b, a = np.array([(1.0 - c) / 2.0, 1.0 - c, (1.0 - c) / 2.0]), np.array([1.0 + alpha, -2.0 * c, 1.0 - alpha])
    return (b / a[0]).tolist(), (a / a[0]).tolist()


def comb(frames: int, gain: float) -> Diagram:
    """y = x + gain times y so many frames ago."""
    b = Builder()
    x, d = b.input(), b.delay("d", n=frames)
    y = b.sum(x, b.gain(d, "g", gain))
    d.takes(y)
    b.output(y)
    return b.build()
