"""A second evaluator of the five forms, written from the specification of the arithmetic and from nothing else.

It knows no graph: each form is its difference equations, in the order in which they are added. `m` is an arithmetic,
fixed or floating point: it multiplies, sums, and puts what leaves a sum into a register.
"""

from collections.abc import Callable, Iterable, Sequence
from typing import Any

import numpy as np
from oracle_fixed import Counts, FixedArithmetic, Section, Stored, Value, stored
from oracle_float import FloatArithmetic
from oracle_words import Format, Refused

__all__ = ["FORMS", "Counts", "Format", "Refused", "run_fixed", "run_float"]


def filled(m: Any, s: Stored, name: str, length: int, zero: Any) -> list[Any]:
    if name not in s.lines:
        s.lines[name] = [m.store(zero) for _ in range(length)]
    return s.lines[name]


def push(m: Any, s: Stored, name: str, newest: Any) -> None:
    line = s.lines[name]
    s.lines[name] = [m.store(value) for value in [newest, *line][: len(line)]]


def direct_1(m: Any, s: Stored, x: Any, last: bool) -> Any:
    """y = b2 x2 - a2 y2 + b1 x1 - a1 y1 + b0 x."""
    recursive = len(s.a) > 1
    xs = [x, *filled(m, s, "x", len(s.b) - 1, m.zero_like(x))]
    ys = [None, *filled(m, s, "y", len(s.a) - 1, m.zero_state())]
    terms = []
    for k in reversed(range(max(len(s.b), len(s.a)))):
        if k < len(s.b):
            terms.append(m.times(s.b[k], xs[k]))
        if 1 <= k < len(s.a):
            terms.append(m.minus_times(s.a[k], ys[k]))
    y = m.sum(terms)
    if recursive or last:
        y = m.register(y, delayed=recursive)
    push(m, s, "x", x)
    push(m, s, "y", y)
    return y


def direct_2(m: Any, s: Stored, x: Any, last: bool, *, swapped: bool = False) -> Any:
    """w = -a2 w2 - a1 w1 + x; y = b2 w2 + b1 w1 + b0 w. Swapped: each half on delays of its own."""
    recursive = len(s.a) > 1
    stores = max(len(s.a), len(s.b)) > 1
    open_gain = not isinstance(x, Value | np.generic)
    zero = m.zero_state() if recursive or open_gain else m.zero_like(x)
    length = len(s.a) - 1 if swapped else max(len(s.a), len(s.b)) - 1
    ws = filled(m, s, "w", length, zero)
    vs = filled(m, s, "v", len(s.b) - 1, zero) if swapped else ws
    w = x
    if recursive or open_gain:
        w = m.sum([*(m.minus_times(s.a[k], ws[k - 1]) for k in reversed(range(1, len(s.a)))), x])
        w = m.register(w, delayed=stores)
    y = m.sum([m.times(s.b[k], [w, *vs][k]) for k in reversed(range(len(s.b)))])
    if last:
        y = m.register(y, delayed=False)
    push(m, s, "w", w)
    if swapped:
        push(m, s, "v", w)
    return y


def direct_1_swapped(m: Any, s: Stored, x: Any, last: bool) -> Any:
    return direct_2(m, s, x, last, swapped=True)


def transposed_1(m: Any, s: Stored, x: Any, last: bool) -> Any:
    """v = x + s1; s1 = -a1 v + s2; s2 = -a2 v; y = b0 v + t1; t1 = b1 v + t2; t2 = b2 v."""
    ss = filled(m, s, "s", len(s.a) - 1, m.zero_state())
    ts = filled(m, s, "t", len(s.b) - 1, m.zero_state())
    if not isinstance(x, Value | np.generic):
        v = m.register(m.sum([x, *ss[:1]]), delayed=False)
    else:
        v = m.pre_sum(x, ss[0]) if ss else x
    new_s = [m.register(m.sum([m.minus_times(s.a[k], v), *ss[k : k + 1]]), delayed=True) for k in range(1, len(s.a))]
    y = m.sum([m.times(s.b[0], v), *ts[:1]])
    if last:
        y = m.register(y, delayed=False)
    new_t = [m.register(m.sum([m.times(s.b[k], v), *ts[k : k + 1]]), delayed=True) for k in range(1, len(s.b))]
    s.lines["s"], s.lines["t"] = [m.store(v) for v in new_s], [m.store(v) for v in new_t]
    return y


def transposed_2(m: Any, s: Stored, x: Any, last: bool) -> Any:
    """y = b0 x + s1; s1 = b1 x - a1 y + s2; s2 = b2 x - a2 y."""
    ss = filled(m, s, "s", max(len(s.a), len(s.b)) - 1, m.zero_state())
    y = m.sum([m.times(s.b[0], x), *ss[:1]])
    if len(s.a) > 1 or last:
        y = m.register(y, delayed=False)
    new = []
    for k in range(1, len(ss) + 1):
        terms = [m.times(s.b[k], x)] if k < len(s.b) else []
        terms += [m.minus_times(s.a[k], y)] if k < len(s.a) else []
        new.append(m.register(m.sum([*terms, *ss[k : k + 1]]), delayed=True))
    s.lines["s"] = [m.store(v) for v in new]
    return y


FORMS: dict[str, Callable[..., Any]] = {
    "direct-1": direct_1, "direct-1-swapped": direct_1_swapped, "direct-2": direct_2,
    "transposed-1": transposed_1, "transposed-2": transposed_2,
}


def frame(m: Any, sections: Sequence[Stored], front: Any, form: str, sample: Any) -> Any:
    """One instant: a register between two sections, the last section's output through the output's word."""
    signal = m.start(sample)
    if front is not None:
        signal = m.times(front, signal)
    for index, section in enumerate(sections):
        if index > 0:
            # Of the five only direct-1 puts the section's input on delays at all times, and those without recursion
            # that have it for their w.
            reads = len(section.b) > 1 and (form == "direct-1" or (len(section.a) == 1 and "direct" in form))
            signal = m.register(signal, delayed=reads)
        signal = FORMS[form](m, section, signal, index == len(sections) - 1)
    return m.end(signal)


def run_fixed(
    sections: Sequence[Section], form: str, codes: Iterable[int], *, channel: int = 0, front: float | None = None,
    **parameters: Any,
) -> tuple[list[int], Counts]:
    """Output codes and counts for input codes; `parameters` are the keywords of a fixed-point format.

    Sections are (b, a) without trailing zeros, a[0] = 1, in the order in which they are drawn. Raises Refused.
    """
    places = Format(**parameters)
    m = FixedArithmetic(places, channel)
    held, gain = stored(sections, front, places)
    return [frame(m, held, gain, form, code) for code in codes], m.counts


def run_float(
    sections: Sequence[Section], form: str, samples: Iterable[float], *, front: float | None = None,
    type: str = "float64", accumulator: str | None = None, fused: bool = False, flush_subnormals: bool = False,
) -> list[float]:
    """Output samples for input samples in floating point."""
    m = FloatArithmetic(type, accumulator, fused, flush_subnormals)
    held = [Stored(list(b), list(a)) for b, a in sections]
    with np.errstate(under="ignore"):
        return [frame(m, held, front, form, sample) for sample in samples]
