"""Why a ranking rejects a coupler, against full enumeration of that coupler."""

from __future__ import annotations

import re

import pytest
from enumeration_kinds import grid_of
from test_exact import holds_all, tight

from optopick.answers import Ranked
from optopick.report.labels import CHECKS
from optopick.uses.rank import rank
from optopick.uses.workers import Here

NAMES = {label: name for name, label in CHECKS.items()}
MISS = re.compile(r"^(?P<label>.+?) (?:(?P<amount>\d+) % (?P<way>over|short)|never met)$")


def names_of(said: str) -> list[str]:
    """The checks that a way to let the coupler in names."""
    return [NAMES[MISS.match(part)["label"]] for part in said.split(" and ")]


@pytest.mark.parametrize("chunk", range(3))
def test_reasons_hold(chunk):
    """Without the limits named there is a design; where more stand in the way, the limits named contradict each other."""
    ways, together = 0, 0
    for seed in range(600 + 20 * chunk, 620 + 20 * chunk):
        brief, couplers = tight(seed)
        found = rank(brief, couplers=couplers, workers=Here())
        grids = {c.part: grid_of(brief, c, failing=True) for c in couplers}
        for one in found.ranked:
            assert isinstance(one, Ranked)
            assert grids[one.coupler.part].feasible.any()
        for one in found.rejected:
            grid = grids[one.part]
            assert not grid.feasible.any()
            every = set(grid.rooms) - {"fewest_pieces"}
            if one.reason.endswith(", and more"):
                missed, _, kept = one.reason.removesuffix(", and more").partition(" with ")
                others = [NAMES[label] for label in kept.removesuffix(" kept").split(" and ") if label]
                mine = [NAMES[missed]] if missed in NAMES else names_of(missed)
                assert not holds_all([grid], [*mine, *others]), (seed, one)
                together += 1
                continue
            for said in one.reason.split("; or "):
                assert holds_all([grid], sorted(every - set(names_of(said)))), (seed, one)
                ways += 1
    assert ways > 3
    assert together + ways > 4
