"""The hidden comparison: the exact probability against published figures and exact sums, the order of what is hidden."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from streamhost.errors import RequestError
from streamhost.measure.hidden import hidden_first, outcome


@pytest.mark.parametrize(
    ("right", "probability"),
    [(12, 0.0384063720703125), (13, 0.0106353759765625), (14, 0.0020905)],  # published tables for 16 trials; exact sums
)
def test_the_probability_is_the_binomial_tail(right: int, probability: float) -> None:
    assert outcome(16, right).probability == pytest.approx(probability, abs=5e-8)


def test_eight_of_ten_is_not_significant_and_nine_are() -> None:
    """P(X >= 8) = (45 + 10 + 1) / 1024 = 0.0547; P(X >= 9) = 11 / 1024."""
    assert outcome(10, 8).probability == 56 / 1024
    assert not outcome(10, 8).significant
    assert outcome(10, 9).significant


def test_the_result_is_a_plain_sentence() -> None:
    assert str(outcome(16, 12)) == "12 of 16 right. A guesser does as well in 38 of 1,000 such tests (p = 0.038)."


@given(st.integers(1, 200), st.data())
def test_the_tails_meet(trials: int, data: st.DataObject) -> None:
    """As well or better, and worse, which by symmetry is better than the mirrored count: together all tests."""
    right = data.draw(st.integers(1, trials))
    assert outcome(trials, right).probability + outcome(trials, trials - right + 1).probability == pytest.approx(1.0, abs=1e-15)


@given(st.integers(1, 200), st.integers(0, 2**32))
def test_what_is_hidden_is_balanced_and_repeats_with_its_seed(trials: int, seed: int) -> None:
    hidden = hidden_first(trials, seed)
    assert len(hidden) == trials
    assert abs(2 * sum(hidden) - trials) <= 1
    assert hidden == hidden_first(trials, seed)


def test_its_order_gives_no_hint() -> None:
    """Each place is the first about as often as not: 400 seeds, 5 standard deviations of a fair coin are 50."""
    orders = [hidden_first(16, seed) for seed in range(400)]
    counts = [sum(order[k] for order in orders) for k in range(16)]
    assert all(abs(count - 200) < 50 for count in counts)
    assert sum(hidden_first(1, seed)[0] for seed in range(400)) in range(150, 251)


@pytest.mark.parametrize(("trials", "right"), [(0, 0), (1001, 1), (10, 11), (10, -1)])
def test_what_cannot_be_is_refused(trials: int, right: int) -> None:
    with pytest.raises(RequestError, match="trials"):
        outcome(trials, right)
