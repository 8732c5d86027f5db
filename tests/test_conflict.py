"""Minimal contradicting sets, against every subset."""

from __future__ import annotations

from itertools import combinations

import numpy as np
import pytest

from optopick.uses.conflict import minimal_conflict

NAMES = tuple("abcdefg")


def sets_of(rng: np.random.Generator) -> list[frozenset[str]]:
    """One to three sets of limits that contradict each other."""
    return [
        frozenset(rng.choice(NAMES, int(rng.integers(1, 4)), replace=False).tolist()) for _ in range(rng.integers(1, 4))
    ]


@pytest.mark.parametrize("seed", range(60))
def test_a_set_that_contradicts_and_no_part_of_it_does(seed):
    rng = np.random.default_rng(seed)
    bad, asked = sets_of(rng), []

    def contradicts(dropped: frozenset[str]) -> bool:
        asked.append(dropped)
        return any(not one & dropped for one in bad)

    out = frozenset(rng.choice(NAMES, int(rng.integers(0, 3)), replace=False).tolist())
    found = minimal_conflict(NAMES, out, contradicts)
    if found is None:
        assert all(one & out for one in bad)
        return
    everything = frozenset(NAMES)
    assert not set(found) & out
    assert contradicts(everything - frozenset(found))
    for part in combinations(found, len(found) - 1):
        assert not contradicts(everything - frozenset(part))
    assert list(found) == sorted(found)


def test_early_names_are_preferred():
    """Of a and g, each alone to blame, the one that comes first; few questions for many names."""
    asked = []

    def contradicts(dropped: frozenset[str]) -> bool:
        asked.append(dropped)
        return not {"n3", "n60"} <= dropped

    names = [f"n{k}" for k in range(64)]
    assert minimal_conflict(names, frozenset(), contradicts) == ("n3",)
    assert len(asked) <= 16
