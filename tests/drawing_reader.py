"""Reads a drawing back from the text of its SVG: lines, dots and arrow heads become wires between symbols.

Nothing is taken from the program that drew: what touches what is found out from coordinates, as an eye would.
"""

import re
import xml.etree.ElementTree as ET
from collections import Counter, defaultdict
from dataclasses import dataclass, field, replace
from itertools import combinations, pairwise

from streamhost.diagram import Diagram, Sum, Taps
from streamhost.diagram.tapped import written_out

SVG = "{http://www.w3.org/2000/svg}"
NEAR = 0.02  # coordinates are written with two decimals
UNDER_HEAD = 4.0  # a wire ends under its arrow head

Spot = tuple[float, float]
Line = tuple[Spot, Spot]


@dataclass(frozen=True)
class Box:
    """A symbol on the page."""

    id: str
    kind: str
    left: float
    top: float
    right: float
    bottom: float
    ports: tuple[Spot, ...]  # of a triangle: the middle of its base, its tip

    def distance(self, other: "Box") -> float:
        return max(self.left - other.right, other.left - self.right, self.top - other.bottom, other.top - self.bottom)


@dataclass
class Page:
    """All that stands in a drawing."""

    lines: list[Line] = field(default_factory=list)
    heavy: list[Line] = field(default_factory=list)  # those of the lines that are said to be part of a loop
    dots: list[Spot] = field(default_factory=list)
    heads: list[tuple[Spot, Spot]] = field(default_factory=list)  # tip, direction
    boxes: list[Box] = field(default_factory=list)
    marks: dict[str, Box] = field(default_factory=dict)
    minuses: list[Spot] = field(default_factory=list)
    width_mm: float = 0.0
    scale: float = 0.0


def page_of(svg: str, detail: int | None = None) -> Page:
    """The drawing, or one of the drawings below it that explain a symbol."""
    root = ET.fromstring(svg)
    parent = root if detail is None else root.findall(f"{SVG}g[@data-part='detail']")[detail]
    groups = {group.get("data-part"): list(group) for group in parent.findall(f"{SVG}g")}
    page = Page(width_mm=float(root.attrib["width"].removesuffix("mm")))
    page.scale = page.width_mm / float(root.attrib["viewBox"].split()[2]) / (25.4 / 96)
    page.heavy = [line for path in groups["loops"] for line in lines_in(path.attrib["d"])]
    page.lines = [line for path in groups["wires"] for line in lines_in(path.attrib["d"])] + page.heavy
    page.dots = [(float(dot.attrib["cx"]), float(dot.attrib["cy"])) for dot in groups["dots"]]
    page.heads = [head_in(path.attrib["d"]) for path in groups["heads"]]
    for element in groups["symbols"]:
        if "data-mark" in element.attrib:
            page.marks[element.attrib["data-mark"]] = box_of(element)
        else:
            page.boxes.append(box_of(element))
    page.minuses = [middle(lines_in(path.attrib["d"])[0]) for path in groups["minus"]]
    return page


def lines_in(d: str) -> list[Line]:
    found = []
    for x, y, way, end in re.findall(r"M([-\d.]+) ([-\d.]+)([HV])([-\d.]+)", d):
        start = (float(x), float(y))
        found.append((start, (float(end), start[1]) if way == "H" else (start[0], float(end))))
    return found


def corners_in(d: str) -> list[Spot]:
    numbers = [float(number) for number in re.findall(r"[-\d.]+", d)]
    return list(zip(numbers[::2], numbers[1::2], strict=True))


def head_in(d: str) -> tuple[Spot, Spot]:
    tip, a, b = corners_in(d)
    base = middle((a, b))
    length = abs(tip[0] - base[0]) + abs(tip[1] - base[1])
    return tip, ((tip[0] - base[0]) / length, (tip[1] - base[1]) / length)


def middle(line: Line) -> Spot:
    return (line[0][0] + line[1][0]) / 2, (line[0][1] + line[1][1]) / 2


def box_of(element: ET.Element) -> Box:
    say = element.attrib
    name, kind = say.get("data-symbol", say.get("data-mark", "")), say.get("data-kind", "mark")
    if "cx" in say:
        x, y, r = float(say["cx"]), float(say["cy"]), float(say["r"])
        return Box(name, kind, x - r, y - r, x + r, y + r, ())
    if "width" in say:
        x, y = float(say["x"]), float(say["y"])
        return Box(name, kind, x, y, x + float(say["width"]), y + float(say["height"]), ())
    tip, a, b = corners_in(say["d"])
    xs, ys = zip(tip, a, b, strict=True)
    return Box(name, kind, min(xs), min(ys), max(xs), max(ys), (middle((a, b)), tip))


def is_at(a: Spot, b: Spot, tolerance: float = NEAR) -> bool:
    return abs(a[0] - b[0]) <= tolerance and abs(a[1] - b[1]) <= tolerance


def is_on(spot: Spot, line: Line) -> bool:
    (x0, y0), (x1, y1) = line
    return min(x0, x1) - NEAR <= spot[0] <= max(x0, x1) + NEAR and min(y0, y1) - NEAR <= spot[1] <= max(y0, y1) + NEAR


def is_between(spot: Spot, line: Line) -> bool:
    return is_on(spot, line) and not is_at(spot, line[0]) and not is_at(spot, line[1])


def faults_of_joints(page: Page) -> list[str]:
    """Three ends without a dot, a dot where fewer than three arms meet, an end on the middle of a line without a dot."""
    faults = []
    for spot in {end for line in page.lines for end in line}:
        arms = arms_at(page, spot)
        dotted = any(is_at(dot, spot) for dot in page.dots)
        if arms > 2 and not dotted:
            faults.append(f"{arms} arms meet at {spot} without a dot")
    faults += [f"the dot at {dot} joins nothing" for dot in page.dots if arms_at(page, dot) < 3]
    return faults


def arms_at(page: Page, spot: Spot) -> int:
    ends = sum(is_at(spot, end) for line in page.lines for end in line)
    return ends + 2 * sum(is_between(spot, line) for line in page.lines)


def nets_of(page: Page) -> list[list[Line]]:
    """Lines that are joined: at a corner, or by a dot."""
    parent = list(range(len(page.lines)))

    def root(i: int) -> int:
        while parent[i] != i:
            i = parent[i]
        return i

    joined = defaultdict(list)
    for i, line in enumerate(page.lines):
        for x, y in line:
            joined[round(x, 1), round(y, 1)].append(i)
    groups = [*joined.values(), *([i for i, line in enumerate(page.lines) if is_on(dot, line)] for dot in page.dots)]
    for group in groups:
        for i, j in pairwise(group):
            parent[root(i)] = root(j)
    nets = defaultdict(list)
    for i, line in enumerate(page.lines):
        nets[root(i)].append(line)
    return list(nets.values())


@dataclass(frozen=True)
class Touch:
    """A symbol that a net reaches: as its source, as a sink of a sign, or (of a mark) either."""

    box: Box
    role: str
    sign: int = 1


def touches(page: Page, net: list[Line], negative: set[Spot]) -> list[Touch]:
    found = []
    for line in net:
        for end, other in (line, line[::-1]):
            length = abs(end[0] - other[0]) + abs(end[1] - other[1])
            way = ((end[0] - other[0]) / length, (end[1] - other[1]) / length)
            for tip, direction in page.heads:
                if direction == way and is_at(tip, (end[0] + way[0] * UNDER_HEAD, end[1] + way[1] * UNDER_HEAD)):
                    found += [Touch(box, "sink", -1 if tip in negative else 1) for box in page.boxes if is_edge(box, tip)]
            found += [Touch(box, role_of(box, end)) for box in page.boxes if is_edge(box, end)]
    return found


def is_edge(box: Box, spot: Spot) -> bool:
    if box.ports:
        return any(is_at(port, spot) for port in box.ports)
    if not (box.left - NEAR <= spot[0] <= box.right + NEAR and box.top - NEAR <= spot[1] <= box.bottom + NEAR):
        return False
    level = min(abs(spot[0] - box.left), abs(spot[0] - box.right)) <= NEAR
    upright = min(abs(spot[1] - box.top), abs(spot[1] - box.bottom)) <= NEAR
    return level or upright


def role_of(box: Box, end: Spot) -> str:
    if box.kind == "gain":
        return "sink" if is_at(end, box.ports[0]) else "source"
    return "either" if box.kind == "mark" else "source"


def negative_tips(page: Page) -> set[Spot]:
    """The tips of the heads that are nearest to a minus."""
    return {min((tip for tip, _ in page.heads), key=lambda tip: distance(tip, minus)) for minus in page.minuses}


def distance(a: Spot, b: Spot) -> float:
    return ((a[0] - b[0]) ** 2 + (a[1] - b[1]) ** 2) ** 0.5


Edges = Counter[tuple[str, str, int]]


def edges_of(page: Page) -> Edges:
    """(source symbol, sink symbol, sign) of every wire that is seen."""
    negative = negative_tips(page)
    nets = [touches(page, net, negative) for net in nets_of(page)]
    driven: dict[int, str] = {}
    while True:
        before = len(driven)
        for i, net in enumerate(nets):
            settled = {touch.box.id for j, other in enumerate(nets) if j in driven and j != i for touch in other
                       if touch.role == "either"}
            sources = [t.box.id for t in net if t.role == "source"] or \
                [t.box.id for t in net if t.role == "either" and t.box.id in settled]
            if len(sources) == 1:
                driven[i] = sources[0]
        if len(driven) == before:
            break
    assert len(driven) == len(nets), "a wire has no source, or more than one"
    edges: Edges = Counter()
    for i, net in enumerate(nets):
        for touch in net:
            if touch.role == "sink" or (touch.role == "either" and touch.box.id != driven[i]):
                edges[driven[i], touch.box.id, touch.sign] += 1
    return edges


def expected_edges(diagram: Diagram, parts: dict[int, list[int]]) -> Edges:
    """What a diagram's drawing must show; `parts`: how many terms each adder of a sum takes, for sums drawn as chains."""
    last = {i: len(parts.get(i, [0])) - 1 for i in range(len(diagram.nodes))}
    edges: Edges = Counter()
    for i, node in enumerate(diagram.nodes):
        if not isinstance(node, Sum):
            edges.update((f"{source}.{last[source]}", f"{i}.0", 1) for source in node.reads)
            continue
        terms = iter(node.terms)
        for part, count in enumerate(parts.get(i, [len(node.terms)])):
            if part:
                edges[f"{i}.{part - 1}", f"{i}.{part}", 1] += 1
            for _ in range(count):
                term = next(terms)
                edges[f"{term.source}.{last[term.source]}", f"{i}.{part}", term.sign] += 1
    return edges


def faults_of_distance(page: Page) -> list[str]:
    """Symbols too near each other, wires in symbols that are not theirs, wires that touch other wires."""
    faults = [f"{a.id} and {b.id} are {a.distance(b)} px apart" for a, b in combinations(page.boxes, 2) if a.distance(b) < 3]
    solid = [*page.boxes, *page.marks.values()]
    for line in page.lines:
        faults += [f"the wire {line} runs through {box.id}" for box in page.boxes if runs_through(line, box, NEAR)]
    nets = nets_of(page)
    for one, other in combinations(nets, 2):
        faults += [f"{a} and {b} touch" for a in one for b in other if run_together(a, b)]
    faults += [f"the mark of {name} meets {box.id}" for name, mark in page.marks.items() for box in solid
               if box is not mark and mark.distance(box) < 2]
    for name, mark in page.marks.items():
        through = [line for line in page.lines if runs_through(line, mark)]
        if len(through) != 1:
            faults.append(f"{len(through)} wires run through the mark of {name}")
    return faults


def runs_through(line: Line, box: Box, edge: float = 0.0) -> bool:
    """Whether some of a line lies inside a box, further in than its edge."""
    (x0, x1), (y0, y1) = (sorted(ends) for ends in zip(*line, strict=True))
    return x0 < box.right - edge and x1 > box.left + edge and y0 < box.bottom - edge and y1 > box.top + edge


def run_together(a: Line, b: Line) -> bool:
    """Whether two lines share more than a right-angled crossing of their middles."""
    level_a, level_b = a[0][1] == a[1][1], b[0][1] == b[1][1]
    if level_a == level_b:
        across, along = (1, 0) if level_a else (0, 1)
        same = abs(a[0][across] - b[0][across]) < 3
        return same and max(a[0][along], b[0][along]) < min(a[1][along], b[1][along]) + 3
    return any(is_on(end, b) for end in a) or any(is_on(end, a) for end in b)


def crossings(page: Page) -> int:
    found = 0
    for one, other in combinations(nets_of(page), 2):
        for a in one:
            for b in other:
                level, upright = (a, b) if a[0][1] == a[1][1] else (b, a)
                if (level[0][1] == level[1][1]) and upright[0][0] == upright[1][0]:
                    spot = (upright[0][0], level[0][1])
                    found += is_between(spot, level) and is_between(spot, upright)
    return found


def parts_of(diagram: Diagram) -> dict[int, list[int]]:
    """How many terms each adder takes, of the sums that are drawn as chains of adders."""
    places = diagram.hints.places_for(diagram.nodes) or {}
    return {index: [part.terms for part in place.parts] for index, place in places.items() if place.parts}


def edges_in_loops(edges: Edges) -> Edges:
    """The wires that lead from a symbol on to where one comes back to it."""
    after = defaultdict(set)
    for source, sink, _ in edges:
        after[source].add(sink)

    def is_reached(start: str, goal: str) -> bool:
        found, todo = {start}, [start]
        while todo:
            new = after[todo.pop()] - found
            found |= new
            todo += new
        return goal in found

    return Counter({edge: count for edge, count in edges.items() if is_reached(edge[1], edge[0])})


def faults_of_loops(page: Page, seen: Edges) -> list[str]:
    """The heavy lines are those of the loops and no others, judged from the wires that are seen."""
    loops = edges_in_loops(seen)
    heavy = edges_of(replace(page, lines=page.heavy)) if page.heavy else Counter()
    return [f"in a loop and not heavy, or heavy and in none: {edge}" for edge in (loops - heavy) + (heavy - loops)]


def faults_of(svg: str, diagram: Diagram, detail: int | None = None) -> list[str]:
    """All that is wrong with a drawing of a diagram."""
    page = page_of(svg, detail)
    seen, wanted = edges_of(page), expected_edges(diagram, parts_of(diagram))
    faults = faults_of_joints(page) + faults_of_distance(page) + faults_of_loops(page, seen)
    faults += [f"drawn and not there: {edge}" for edge in seen - wanted]
    return faults + [f"not drawn: {edge}" for edge in wanted - seen]


def faults_of_figure(svg: str, diagram: Diagram) -> list[str]:
    """The same of a drawing and of the drawings of its tapped lines below it; a tapped line alone is the drawing."""
    lines = [written_out(diagram, index, diagram.nodes[node.source].label, node.label)[0]
             for index, node in enumerate(diagram.nodes) if isinstance(node, Taps)]
    if len(lines) == 1 and len(diagram.nodes) == 3:
        return faults_of(svg, lines[0])
    faults = faults_of(svg, diagram)
    for number, line in enumerate(lines):
        faults += [f"line {number}: {fault}" for fault in faults_of(svg, line, number)]
    return faults
