"""Sections in series, as a diagram."""

from streamhost.diagram import Builder, Diagram
from streamhost.structures.division import Division
from streamhost.structures.form import Draft, Form


def draw(division: Division, form: Form) -> Diagram:
    """Each section in the form, a register between two, the last section's output to the output.

    Sections share no delays. The gain in front is drawn before the first section and belongs to it.
    """
    builder = Builder()
    signal = builder.input()
    if division.front is not None:
        signal = builder.gain(signal, "g", division.front, section=0, part="b")
    several = len(division.sections) > 1
    for index, section in enumerate(division.sections):
        if index > 0:
            signal = builder.round(signal, f"between_{index}")
        draft = Draft(builder, section, index, f"_{index + 1}" if several else "")
        signal = form.build_section(draft, signal)
    builder.output(signal)
    return builder.build()
