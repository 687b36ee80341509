"""Checks a certificate of limit cycles again: python3 recheck.py CERTIFICATE.json [LARGEST-BOX to walk, 1000000 unless given]
In a cycle, u = T x of the states x obeys |u| <= S + |M| |u|, S the largest errors times what they cause in K frames, and M =
T A^K inv(T): so |u| <= bounds where S + |M| bounds <= bounds. The box of these x holds the cycles stated and no others."""
import json
import sys
from itertools import product
from math import floor, inf, prod

EXACT = {"state": "s[{1}]", "zero": "0", "gain": "v{1} * (c[{2}] >> {3})", "add": "v{1} + {2} * v{3}",
         "half-up": "v{1} + (1 << {2} - 1) >> {2}", "half-even": "v{1} + (1 << {2} - 1) - 1 + (v{1} >> {2} & 1) >> {2}",
         "half-away": "v{1} + (1 << {2} - 1) - (v{1} < 0) >> {2}", "toward-zero": "v{1} + (v{1} < 0) * ((1 << {2}) - 1) >> {2}",
         "floor": "v{1} >> {2}", "saturate": "min(max(v{1}, {2}), {3})", "wrap": "(v{1} - {2}) % ({3} - {2} + 1) + {2}",
         "left": "v{1} * 2 ** {2}", "residue": "v{1} - v{2} * 2 ** {3}"}
ERRORS = {"half-up": 0.5, "half-even": 0.5, "half-away": 0.5, "floor": 1.0, "toward-zero": 1.0}
LINEAR = {**EXACT, **dict.fromkeys(ERRORS, "v{1} * 2.0 ** -{2} + e.get({0}, 0.0)"), "saturate": "v{1}", "wrap": "v{1}"}
def function(section, words):
    lines = [f"v{node[0]} = " + words[kind].format(*map(int, node)) for kind, *node in section["nodes"]]
    values = ["".join(f"v{int(v)}, " for v in section[key]) for key in ("next", "registers")]
    exec("\n    ".join(["def step(s, e={}):", *lines, "return ({}), ({})".format(*values)]), made := {"c": section["codes"]})
    return made["step"]
def times(matrix, vector):
    return tuple(sum(a * b for a, b in zip(row, vector)) for row in matrix)
def bounded(section, frames):
    step, T, B = function(section, LINEAR), section["transform"], section["bounds"]
    S = R = zero = (0.0,) * len(B)
    for kind, v, *_ in (node for node in section["nodes"] if node[0] in ERRORS):
        x, _ = step(zero, {v: ERRORS[kind]})
        for _ in range(frames):
            S, (x, _) = [s + abs(u) for s, u in zip(S, times(T, x))], step(x)
    for x, bound in zip(zip(*section["inverse"]), B):
        for _ in range(frames):
            x, _ = step(x)
        R = [r + abs(u) * bound for r, u in zip(R, times(T, x))]
    return all(s + r <= b for s, r, b in zip(S, R, B)) or (max(R) > 1e-9 > frames / 1e15 and bounded(section, 4 * frames))
def cycles(section, starts, limits):  # the period and the largest magnitude of each register, of every cycle that is met
    step, done = function(section, EXACT), set()
    for x in starts:
        path = {}
        while x not in path and x not in done and all(abs(u) <= m for u, m in zip(times(section["transform"], x), limits)):
            path[x], x = reversed(step(x))
        if x in path:
            yield len(path) - list(path).index(x), *(max(map(abs, r)) for r in zip(*list(path.values())[list(path).index(x):]))
        done.update(path)
def faults(section, most):
    T, inverse, limits = section["transform"], section["inverse"], [floor(bound) for bound in section["bounds"]]
    there = [times(T, column) for column in zip(*inverse)]
    if limits and (there != [tuple(i == k for i in range(len(T))) for k in range(len(T))] or not bounded(section, 64)):
        yield "WRONG: a bound does not hold"
    if any([[*c] for c in cycles(section, [tuple(x)], [inf] * len(x))] != [cycle] for x, cycle in section["met"]):
        yield "WRONG: what was met is no cycle"
    if not section["proven"] or not limits or prod(2 * m + 1 for m in limits) > most:
        return (yield "what is stated of it holds; its box was not walked again")
    starts = (times(inverse, u) for u in product(*(range(-m, m + 1) for m in limits)))
    stated = [tuple(cycle) for count, *cycle in section["cycles"] for _ in range(count)]
    yield "holds; its box was walked" if sorted(cycles(section, starts, limits)) == stated else "WRONG: other cycles are there"
if __name__ == "__main__":
    sections, most = json.load(open(sys.argv[1]))["sections"], int((*sys.argv, 10**6)[2])
    found = [f"{each['name']}: {'; '.join(faults(each, most))}\n" for each in sections]
    sys.stdout.writelines(found)
    sys.exit(any("WRONG" in said for said in found))
