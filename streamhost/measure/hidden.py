"""The hidden comparison: which of two lanes is the hidden one, asked a number of times that was fixed beforehand.

Known in the literature as ABX; the probability is the exact upper tail of the binomial distribution with p = 1/2.
"""

from dataclasses import dataclass
from fractions import Fraction
from math import comb

from streamhost.errors import RequestError
from streamhost.signals import random_words

MOST_TRIALS = 1000
SIGNIFICANT = Fraction(1, 20)


@dataclass(frozen=True)
class Outcome:
    """Of so many trials so many right; `probability` that a guesser does as well or better."""

    trials: int
    right: int
    probability: float
    significant: bool

    def __str__(self) -> str:
        """A plain sentence."""
        share = _exact(self.trials, self.right)
        return (f"{self.right} of {self.trials} right. A guesser does as well in {round(1000 * share):,} of 1,000 such tests "
                f"(p = {self.probability:.3f}).")


def outcome(trials: int, right: int) -> Outcome:
    """What so many right answers are worth. RequestError for no trials, more than 1,000, and answers that cannot be."""
    check_trials(trials)
    if not 0 <= right <= trials:
        raise RequestError(f"right = {right}: of {trials} trials between 0 and {trials} are right.")
    share = _exact(trials, right)
    return Outcome(trials, right, float(share), share < SIGNIFICANT)


def check_trials(trials: int) -> None:
    """RequestError for a number of trials that no comparison has."""
    if not 1 <= trials <= MOST_TRIALS:
        raise RequestError(f"trials = {trials}: a hidden comparison has 1 to {MOST_TRIALS:,} trials.")


def hidden_first(trials: int, seed: int) -> tuple[bool, ...]:
    """For each trial whether the hidden lane is the first: balanced, as often one as the other, or once more; shuffled."""
    check_trials(trials)
    words = [int(word) for word in random_words(seed, trials + 1)]
    firsts = trials // 2 + (trials % 2) * (words[trials] >> 63)
    order = sorted(range(trials), key=lambda k: (words[k], k))
    chosen = set(order[:firsts])
    return tuple(k in chosen for k in range(trials))


def _exact(trials: int, right: int) -> Fraction:
    return Fraction(sum(comb(trials, k) for k in range(right, trials + 1)), 2**trials)
