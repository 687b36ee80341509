"""How far running sums walk away from what they should hold, since in floating point what they lose stays lost."""

from collections.abc import Callable, Iterator

import numpy as np
from numpy.typing import NDArray

from streamhost.diagram.norms import responses_to_output
from streamhost.measure.floats.playing import noise
from streamhost.measure.floats.result import Drift
from streamhost.measure.levels import peak_dbfs
from streamhost.measure.running import Run
from streamhost.program.float_errors import float_errors
from streamhost.program.poles import running_sums
from streamhost.realization import Realization

FloatArray = NDArray[np.float64]
Report = Callable[[float, str], None]

SECONDS, QUICK_SECONDS = 10.0, 3.0
STEPS_A_SECOND = 50
LATE = 1 << 12
"""Frames after its last delay in which all of a response but what never dies out is over."""

NO_SUM = "no running sum is here that loses anything"


def drifts(realization: Realization, quick: bool, report: Report) -> Iterator[Drift]:
    """Of each output. Nothing where no running sum loses anything."""
    if not running_sums(realization.program)[1]:
        return
    step = round(realization.rate / STEPS_A_SECOND)
    steps = round((QUICK_SECONDS if quick else SECONDS) * STEPS_A_SECOND)
    places, rms = _errors_at_steps(realization, steps, step, report)
    for output, name in enumerate(realization.outputs):
        moved = np.diff(places[:, output], axis=0)
        channel = int(np.argmax((moved**2).mean(axis=0)))
        yield Drift(
            output=name if len(realization.outputs) > 1 else "",
            duration_s=steps / STEPS_A_SECOND,
            found_after_1_s_dbfs=peak_dbfs(float(np.sqrt((moved[:, channel] ** 2).mean() * STEPS_A_SECOND))),
            predicted_after_1_s_dbfs=peak_dbfs(_walk(realization, rms[channel], channel, output)),
            at_end_dbfs=peak_dbfs(float(abs(places[-1, output, channel]))),
        )


def _errors_at_steps(realization: Realization, steps: int, step: int, report: Report) -> tuple[FloatArray, FloatArray]:
    """Realized minus ideal at the end of each step, (steps, outputs, channels), and the nodes' rms, (channels, nodes)."""
    channels = realization.program.diagram.channels
    run = Run(realization, channels)
    x = np.repeat(noise(steps * step)[:, None], channels, axis=1)
    places, squares = [], np.zeros((channels, len(realization.program.nodes)))
    for k in range(steps):
        report(k / steps, f"running sums, {k / STEPS_A_SECOND:.1f} s")
        block = run.step(x[k * step : (k + 1) * step])
        places.append(block.difference[-1])
        squares += np.einsum("fcn,fcn->cn", block.trace, block.trace)
    return np.array(places), np.sqrt(squares / len(x))


def _walk(realization: Realization, rms: FloatArray, channel: int, output: int) -> float:
    """The rms that errors which never die out add up to at the output in a second."""
    program = realization.program
    errors = float_errors(program, rms)
    late = responses_to_output(program.diagram, list(errors), channel, output=output, frames=program.state_words + LATE)[-1]
    return float(np.sqrt(realization.rate * (late**2 @ np.array(list(errors.values())))))
