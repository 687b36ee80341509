"""Stable, marginal or unstable, decided on the coefficients as stored."""

from streamhost.filters.stability import step_down
from streamhost.measure.realized.result import Stability
from streamhost.program.poles import denominators, on_and_outside, running_sums
from streamhost.realization import Realization


def stability_of(realization: Realization) -> Stability:
    """Of the channel that has most poles on or outside the circle. Which are on it is decided exactly."""
    diagram = realization.program.diagram
    of_channels = [denominators(diagram, channel) for channel in range(diagram.channels)]
    cancelled = running_sums(realization.program)[0]
    on, outside = on_and_outside(diagram)
    on -= cancelled
    reflections = [abs(float(stage[-1])) for loops in of_channels for each in loops for stage in step_down(each)]
    return Stability(
        verdict="unstable" if outside else "marginal" if on else "stable",
        on_circle=on, outside=outside, cancelled=cancelled,
        largest_reflection=max(reflections, default=None),
        largest_radius=None,
    )
