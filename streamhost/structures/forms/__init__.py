"""The forms that can be chosen, one file each."""

from streamhost.structures.choices import check
from streamhost.structures.form import Form
from streamhost.structures.forms import (
    all_pass_sum,
    coupled,
    delta,
    direct_1,
    direct_1_swapped,
    direct_2,
    error_feedback,
    error_feedback_1,
    error_feedback_2,
    error_feedback_c1,
    fir_lattice,
    folded,
    frequency_sampling,
    kingsbury,
    lattice_ladder,
    lattice_normalized,
    lattice_one_multiplier,
    minimum_noise,
    normal,
    running_sum,
    state_variable,
    state_variable_delayed,
    transposed_1,
    transposed_2,
    wave_digital,
    zoelzer,
)

MODULES = (
    direct_1,
    direct_1_swapped,
    direct_2,
    transposed_1,
    transposed_2,
    lattice_ladder,
    lattice_one_multiplier,
    lattice_normalized,
    coupled,
    state_variable,
    state_variable_delayed,
    error_feedback_1,
    error_feedback_2,
    error_feedback_c1,
    error_feedback,
    normal,
    minimum_noise,
    delta,
    kingsbury,
    zoelzer,
    all_pass_sum,
    wave_digital,
    folded,
    fir_lattice,
    running_sum,
    frequency_sampling,
)

FORMS: dict[str, Form] = {module.FORM.name: module.FORM for module in MODULES}


def forms() -> tuple[str, ...]:
    """The names of all forms."""
    return tuple(FORMS)


def form(name: str) -> Form:
    """The form of that name; StructureError, with the nearest name, where there is none."""
    check("form", name, FORMS)
    return FORMS[name]
