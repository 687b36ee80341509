"""What is certain to be dangerous about a program, said in one sentence each."""

from streamhost.formats import Fixed
from streamhost.program.poles import DROPS, FLOATS, SATURATES, WRAPS, cancelled_on_circle, on_and_outside, running_sums
from streamhost.program.program import Program

WHAT_IS_LOST = {
    FLOATS: "its rounding in floating point is not: what it loses stays lost, and the output drifts.",
    DROPS: "the bits that its loop drops are not: what it loses stays lost, and the output drifts.",
    SATURATES: "its saturation is not: what is clipped once stays lost, and the output is off from there on. Where it wraps "
               "it is exact.",
    WRAPS: "since its loop wraps and drops no bit, nothing is lost as long as what is read of it fits its word.",
}


def hazards_of(program: Program) -> tuple[str, ...]:
    """Sentences for the user; none where nothing is certain."""
    return (*_narrow_operand(program), *_drifting(program), *_moved_out(program), *_cancelled(program))


def _narrow_operand(program: Program) -> tuple[str, ...]:
    format = program.format
    if not isinstance(format, Fixed) or not program.drawn.has_loop():
        return ()
    state, operand = format.state.word, format.operand.word
    if state.fraction <= operand.fraction:
        return ()
    said = (
        f"the state is kept as {state} and multiplied as {operand}: what the multipliers do not see of it is rounded "
        f"anew in every frame, and the recursion is as loud as with a state of {operand.fraction} fraction bits."
    )
    return (said,)


def _drifting(program: Program) -> tuple[str, ...]:
    if not running_sums(program)[1]:
        return ()
    why = "adds more fraction bits than the signal has" if isinstance(program.format, Fixed) else "is rounded in floating point"
    said = (
        f"the running sum {why}: what it loses stays lost, and its output drifts. In fixed point it is exact where what it "
        "adds is no longer than the signal."
    )
    return (said,)


def _moved_out(program: Program) -> tuple[str, ...]:
    """Poles that the rounding of coefficients moves onto the unit circle, or over it."""
    on, outside = on_and_outside(program.diagram)
    if not on + outside:
        return ()
    on_before, outside_before = on_and_outside(program.drawn)
    said = []
    if on > on_before:
        said.append(f"rounding the coefficients puts {_poles(on - on_before)} on the unit circle: what is in the loop once "
                    "never dies out, and what its roundings drop adds up.")
    if outside > outside_before:
        said.append(f"rounding the coefficients puts {_poles(outside - outside_before)} outside the unit circle: what is in "
                    "the loop once grows until it overflows.")
    return tuple(said)


def _cancelled(program: Program) -> tuple[str, ...]:
    """Poles on the circle that no response shows, of loops other than running sums that are marked as such."""
    found = cancelled_on_circle(program)
    if found is None:
        return ()
    so = "the response is finite" if found.finite else "the response shows nothing of it"
    verb = "is" if found.poles == 1 else "are"
    return (f"{_poles(found.poles)} on the unit circle {verb} cancelled by zeros, and {so}; {WHAT_IS_LOST[found.lost]}",)


def _poles(count: int) -> str:
    return f"{count} pole" + "s" * (count > 1)
