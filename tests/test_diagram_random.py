"""The generator of random diagrams, on which the laws of many tests stand: legal, varied, and the same every time."""

from collections import Counter
from random import Random

import numpy as np
import pytest
from random_diagrams import COARSE, KINDS, random_diagram

from streamhost.diagram import Diagram, Gain, Residue, Round, Sum, Taps
from streamhost.diagram.legality import check_diagram
from streamhost.diagram.linear import state_space


def many(**options: object) -> list[Diagram]:
    return [random_diagram(Random(seed), 3 + seed % 30, **options) for seed in range(60)]  # type: ignore[arg-type]


def test_all_kinds_and_variants_come_up_and_everything_is_legal() -> None:
    found: Counter[str] = Counter()
    for diagram in many():
        check_diagram(diagram)
        assert len(diagram.inputs) == 1
        for node in diagram.nodes:
            found[node.kind] += 1
            found[f"{node.kind} of {getattr(node, 'n', 1)} frames"] += 1
            found["mark"] += isinstance(node, Sum) and node.grow is not None
            if isinstance(node, Taps):
                found[f"{node.fold} {'last' if node.last_first else 'first'}"] += 1
            if isinstance(node, Residue):
                found[f"residue of a {diagram.nodes[node.source].kind}"] += 1
        found[f"{len(diagram.outputs)} outputs"] += 1
        found["loop"] += diagram.has_loop()
    assert {"input", "output", "delay", "gain", "shift", "sum", "taps", "round", "residue", "mark", "loop",
            "delay of 3 frames", "even first", "odd first", "None first", "None last", "1 outputs", "3 outputs",
            "residue of a sum", "residue of a round"} <= {key for key, count in found.items() if count}


def test_the_same_seed_gives_the_same_diagram_and_another_another() -> None:
    first, again, other = (random_diagram(Random(seed)) for seed in (1, 1, 2))
    assert first.hash == again.hash
    assert np.array_equal(first.values, again.values)
    assert first.hash != other.hash


def test_coarse_coefficients_are_multiples_within_two() -> None:
    for diagram in many(step=COARSE, channels=2):
        assert np.array_equal(diagram.values / COARSE, np.round(diagram.values / COARSE))
        assert np.abs(diagram.values).max(initial=0.0) < 2.0


def test_poles_lie_within_the_radius_and_some_near_it() -> None:
    radii = [np.abs(np.linalg.eigvals(state_space(d, c).A)).max(initial=0.0) for d in many(channels=2) for c in (0, 1)]
    assert max(radii) <= 0.98
    assert max(radii) > 0.7


@pytest.mark.parametrize("left_out", KINDS)
def test_a_kind_left_out_does_not_come_up(left_out: str) -> None:
    kinds = tuple(kind for kind in KINDS if kind != left_out)
    for diagram in many(kinds=kinds):
        match left_out:
            case "mark":
                assert not any(isinstance(n, Sum) and n.grow is not None for n in diagram.nodes)
            case "loop":
                assert not diagram.has_loop()
            case "residue" | "taps" | "shift":
                assert left_out not in {n.kind for n in diagram.nodes}


def test_feedback_coefficients_are_read_by_one_sum_that_subtracts_them() -> None:
    seen = 0
    for diagram in many():
        for index, node in enumerate(diagram.nodes):
            if isinstance(node, Gain) and diagram.slots[node.coefficient].feedback:
                (reader,) = diagram.readers[index]
                terms = getattr(diagram.nodes[reader], "terms", ())
                assert [term.sign for term in terms if term.source == index] == [-1]
                seen += 1
    assert seen


def test_residues_are_of_rounds_or_of_sums_that_a_delay_reads() -> None:
    for diagram in many():
        for node in diagram.nodes:
            if isinstance(node, Residue) and not isinstance(diagram.nodes[node.source], Round):
                readers = {diagram.nodes[reader].kind for reader in diagram.readers[node.source]}
                assert "delay" in readers
