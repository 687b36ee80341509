"""The block diagrams."""

from collections.abc import Iterator

from streamhost.report.contents import Contents
from streamhost.report.figure import Figure, Panel
from streamhost.report.words import ranges

METHOD = "Drawn from the graph that runs. An open square with Q: the value is rounded there. Heavy wires are part of a loop."


def figures(contents: Contents) -> Iterator[Figure]:
    """One figure; what is drawn alike is drawn once."""
    alike: dict[str, list[int]] = {}
    for lane in contents.lanes:
        if lane.drawing:
            alike.setdefault(lane.drawing, []).append(lane.number)
    if not alike:
        return
    lanes = {lane.number: lane for lane in contents.lanes}
    panels = [Panel(f"{lanes[numbers[0]].form.split(' · ')[0]}: {lanes[numbers[0]].counts}", ranges(numbers), svg=svg)
              for svg, numbers in alike.items()]
    what = "Block diagram" if len(panels) == 1 else "Block diagrams"
    yield Figure(f"{what}, with the coefficients before they are rounded.", METHOD, tuple(panels), columns=1)
