"""Predicted noise against measured: forms x {Q1.15, Q1.23} x five filters, on seeded white noise.

    python tests/benchmarks/noise_grid.py [FORM ...]

A cell is measured minus predicted in dB where the white model is said to hold; a letter, explained below, where it is said
not to or there is no figure; nothing where the form does not carry the filter. `!` marks a difference of more than 0.3 dB that
is not within the measurement's own 95 % interval either.
"""

import sys
from collections import Counter
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parents[1]))

from noise_cases import FINITE, PEAK_DBFS, RECURSIVE, SECONDS, SEED, WORDS, Case, cases

from streamhost import forms
from streamhost.commands.common import Column, ledger


def kind_of(reason: str) -> str:
    """A reason without the names and numbers of its case."""
    for part, kind in (
        ("overflow", "overflows"), ("settle", "does not settle"), ("inside sums", "errors inside sums are not written down"),
        ("variance", "a rounding drops values of another variance"), ("in the mean", "a rounding has another mean"),
        ("uniform", "what is dropped is not uniform"), ("drifts", "the mean of what is dropped drifts"),
        ("not white", "what is dropped is not white"), ("follows the input", "what is dropped follows the input"),
        ("correlated", "what is dropped is correlated"), ("nothing", "nothing is rounded"),
    ):
        if part in reason:
            return kind
    return reason


def cell(found: Case, letters: dict[str, str]) -> str:
    if found.holds and found.off is not None:
        return f"{found.off:+.2f}{'' if found.agrees else ' !'}"
    return letters.setdefault(kind_of(found.reason), "abcdefghijklmnopqrstuvwxyz"[len(letters)])


def main(names: tuple[str, ...]) -> None:
    found: list[Case] = []
    for one in cases(names):
        found.append(one)
        print(f"{len(found)}: {one}", file=sys.stderr, flush=True)
    letters: dict[str, str] = {}
    rows = []
    for name in names:
        own = [one for one in found if one.form == name]
        filters = FINITE if any(one.filter in FINITE for one in own) else RECURSIVE
        by_place = {(one.filter, one.word): cell(one, letters) for one in own}
        rows.append([name, *(by_place.get((each, word), "") for each in filters for word in WORDS)])
    columns = [Column("form"), *(Column(str(number), word) for number in range(1, len(RECURSIVE) + 1) for word in WORDS)]
    print(ledger(columns, rows, numbered=False))
    for number, (recursive, finite) in enumerate(zip(RECURSIVE, FINITE, strict=True), 1):
        print(f"{number}: {recursive}; of forms for finite responses: {finite}")
    counts = Counter(kind_of(one.reason) for one in found if not one.holds)
    for kind, letter in letters.items():
        print(f"{letter}: {kind} ({counts[kind]})")
    judged = [one for one in found if one.holds]
    right = sum(one.agrees for one in judged)
    share = 100.0 * right / max(1, len(judged))
    print(f"White noise, {SECONDS} s, peak {PEAK_DBFS:g} dBFS, seed {SEED}. The white model is said to hold in "
          f"{len(judged)} of {len(found)} cases; in {right} of these, {share:.1f} %, measured is within 0.3 dB of "
          "predicted or in the interval.")


if __name__ == "__main__":
    main(tuple(sys.argv[1:]) or forms())
