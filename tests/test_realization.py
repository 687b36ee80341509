"""What a realization takes, gives and refuses."""

import numpy as np
import pytest

import streamhost as sh
from streamhost.errors import FilterError, FormatError, RequestError, StructureError

PEAK = sh.design("peak", rate=48000, frequency=1000, gain_db=6, q=0.707)
X = np.random.default_rng(1).uniform(-0.5, 0.5, (64, 2))


def test_state_is_kept_from_call_to_call_and_cleared_by_reset() -> None:
    realization = sh.realize(PEAK, form="direct-1", format="16x16+40")
    whole = realization.process(X)
    realization.reset()
    assert np.array_equal(np.concatenate([realization.process(X[:13]), realization.process(X[13:])]), whole)
    realization.reset()
    assert np.array_equal(realization.process(X), whole)


def test_one_dimension_in_is_one_dimension_out() -> None:
    realization = sh.realize(PEAK)
    y = realization.process(X[:, 0])
    realization.reset()
    assert y.shape == (64,)
    assert np.array_equal(y, realization.process(X)[:, 0])


def test_several_outputs_come_beside_each_other() -> None:
    b = sh.Builder()
    x = b.input()
    b.output(b.gain(x, "half", 0.5), "low")
    b.output(b.gain(x, "quarter", 0.25), "high")
    from dataclasses import replace

    built = replace(sh.realize(PEAK).built, diagram=b.build())
    y = sh.Realization(PEAK, built, sh.Float("float64")).process(X)
    assert y.shape == (64, 2, 2)
    assert np.array_equal(y[:, 0], X / 2)
    assert np.array_equal(y[:, 1], X / 4)


def test_an_empty_block_passes() -> None:
    realization = sh.realize(PEAK, format="16x16+40")
    assert realization.process(np.zeros((0, 2))).shape == (0, 2)
    assert realization.process_codes(np.zeros((0, 2), np.int64)).shape == (0, 2)
    realization.reset()
    assert realization.process_codes([]).shape == (0,)


def test_the_tally_counts_what_saturates_and_what_is_no_number() -> None:
    loud = sh.realize(sh.Filter.from_coefficients([0.75, 0.75], rate=48000), form="direct-1", format="16x16+40")
    loud.process(np.array([0.9, 0.9, np.nan, 0.0]))
    tally = loud.tally()
    assert (tally.not_a_number, tally.saturations, tally.wraps, tally.accumulator_overflows) == (1, 1, 0, 0)
    loud.reset()
    assert loud.tally() == type(tally)(0, 0, 0, 0)


def test_poles_that_rounding_put_on_the_circle_are_counted_exactly() -> None:
    """Own computation on the cookbook formulas: at 20 Hz in Q2.14 a pole lands exactly on z = 1."""
    low = sh.design("low-pass", rate=48000, frequency=20, q=0.5**0.5)
    fixed = sh.Fixed("Q1.15", coefficients="Q2.14", allow_vanishing=True)
    assert sh.realize(low, form="direct-1", format=fixed).unstable == 1
    assert sh.realize(low, form="direct-1", format="float64").unstable == 0


def test_the_source_is_the_kernel_that_runs() -> None:
    source = sh.realize(PEAK, form="direct-1", format="16x16+40").source()
    assert "def kernel(" in source
    assert "M[" in source
    assert "# y" in source


@pytest.mark.parametrize(("call", "error", "message"), [
    (lambda r: r.process(["a"]), RequestError, "takes real numbers, not"),
    (lambda r: r.process([1j]), RequestError, "takes real numbers, not complex128"),
    (lambda r: r.process(np.zeros((2, 2, 2))), RequestError, r"this one has the shape \(2, 2, 2\)"),
    (lambda r: r.process_codes([0.5]), RequestError, "takes integers, not float64"),
    (lambda r: r.process_codes([40000]), RequestError, "A code of Q1.15 runs from -32768 to 32767"),
    (lambda r: (r.process(X), r.process(X[:, :1])), RequestError, "Number of channels: 2 in the blocks before, 1"),
    (lambda r: sh.realize(PEAK).process_codes([1]), RequestError, "float64 has no codes"),
    (lambda r: sh.realize(3), FilterError, "realize takes a Filter, not int"),
    (lambda r: sh.realize(PEAK, format=3), FormatError, "format = 3 is no Fixed, no Float"),
    (lambda r: sh.realize(PEAK, format="float23"), FormatError, 'Did you mean "float32"'),
    (lambda r: sh.realize(PEAK, form="direct-3"), StructureError, "direct-2"),
    (lambda r: sh.realize(sh.Filter.from_coefficients([1], [1, -1.5], rate=48000)), FilterError, "unstable"),
    (lambda r: sh.realize(PEAK, format=sh.Fixed(coefficients="Q1.15")), FormatError, "does not fit Q1.15"),
])
def test_mistakes_are_told(call, error, message) -> None:  # type: ignore[no-untyped-def]
    with pytest.raises(error, match=message):
        call(sh.realize(PEAK, form="direct-1", format="16x16+40"))


def test_codes_keep_their_word() -> None:
    """ITU-T G.729 (03/96) 3.1 eq. (1): the pre-processing high-pass in Q12, with the DC gain that is exactly 0 there."""
    rows = [[1899, -3798, 1899, -7807, 3733]]
    filter = sh.Filter.from_codes(rows, "Q4.12", rate=8000)
    realization = sh.realize(filter, form="direct-1", format="16x16+40")
    assert realization.program.stored is not None
    assert {str(word) for word in realization.program.stored.words} == {"Q4.12"}
    assert realization.program.stored.codes == ((1899,), (3733,), (-3798,), (-7807,), (1899,))
    with pytest.raises(FormatError, match="leave `coefficients` out"):
        sh.realize(filter, form="direct-1", format=sh.Fixed("Q1.15", coefficients="Q3.13"))


def test_a_wide_state_behind_a_narrow_operand_is_a_hazard():
    filter = sh.design("low-pass", rate=48000, frequency=100, q=0.7)
    narrow = sh.realize(filter, form="direct-1", format=sh.Fixed("Q1.15", coefficients="Q2.30", state="Q1.31"))
    assert any("kept as Q1.31 and multiplied as Q1.15" in hazard for hazard in narrow.hazards)
    wide = sh.realize(filter, form="direct-1", format=sh.Fixed("Q1.15", coefficients="Q2.30", state="Q1.31", operand="Q1.31"))
    assert wide.hazards == ()
    # Where nothing is fed back, nothing is rounded anew.
    finite = sh.Filter.from_coefficients([0.5, 0.25], rate=48000)
    assert sh.realize(finite, form="direct-1", format=sh.Fixed("Q1.15", state="Q1.31")).hazards == ()
    assert sh.realize(filter, form="direct-1").hazards == ()
