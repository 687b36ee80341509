"""Stable, marginal or unstable, decided on the coefficients as stored."""

from streamhost.filters.stability import roots_on_and_outside, step_down
from streamhost.measure.realized.result import Stability
from streamhost.program.poles import denominators, running_sums
from streamhost.realization import Realization


def stability_of(realization: Realization) -> Stability:
    """Of the channel that has most poles on or outside the circle. Which are on it is decided exactly."""
    diagram = realization.program.diagram
    of_channels = [denominators(diagram, channel) for channel in range(diagram.channels)]
    counts = [[roots_on_and_outside(each) for each in loops] for loops in of_channels]
    worst = max(counts, key=lambda pairs: (sum(outside for _, outside in pairs), sum(on for on, _ in pairs)))
    cancelled = running_sums(realization.program)[0]
    on, outside = sum(on for on, _ in worst) - cancelled, sum(outside for _, outside in worst)
    reflections = [abs(float(stage[-1])) for loops in of_channels for each in loops for stage in step_down(each)]
    return Stability(
        verdict="unstable" if outside else "marginal" if on else "stable",
        on_circle=on, outside=outside, cancelled=cancelled,
        largest_reflection=max(reflections, default=None),
        largest_radius=None,
    )
