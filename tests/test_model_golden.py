"""The model's formulation, row by row, against the files of tests/golden.

A difference here is a change of the mathematics. Where it is meant: `python -m tests.renew_golden`, then read the
difference before committing it.
"""

from __future__ import annotations

import difflib

import pytest
from golden_models import FOLDER, golden_texts

FAMILIES = {
    "ctr_margin",
    "output_low",
    "output_high",
    "total_power",
    "conducts",
    "edge_on",
    "edge_off",
    "delay_on",
    "delay_off",
    "storage",
    "power",
    "least_power",
    "staircase_edge_off",
    "staircase_delay_on",
    "staircase_delay_off",
    "staircase_late_on",
    "staircase_late_off",
}


@pytest.fixture(scope="module")
def texts() -> dict[str, str]:
    return golden_texts()


def test_every_family_has_its_file(texts):
    """No family without a file, no file without a family, and none of the families that there must be is gone."""
    assert {path.name for path in FOLDER.glob("*.lp")} == set(texts)
    assert {f"phototransistor.{family}.lp" for family in FAMILIES} <= set(texts)


@pytest.mark.parametrize("name", sorted(path.name for path in FOLDER.glob("*.lp")))
def test_formulation_is_unchanged(texts, name):
    golden = (FOLDER / name).read_text(encoding="utf-8").splitlines()
    found = texts.get(name, "").splitlines()
    difference = "\n".join(difflib.unified_diff(golden, found, f"golden/{name}", "the model now", lineterm="", n=1))
    assert not difference, f"{difference}\n\nIf this is meant: python -m tests.renew_golden"


def test_every_corner_has_its_row():
    """Two temperatures, both ends of the bin: four corners; heat knows temperatures only, power none."""
    counts = {}
    for family in FAMILIES:
        text = (FOLDER / f"phototransistor.{family}.lp").read_text(encoding="utf-8")
        counts[family] = text.count("c_l_rows(")
    static = {"ctr_margin", "output_low", "output_high", "conducts"}
    times = {"edge_on", "edge_off", "delay_on", "delay_off", "storage"}
    assert {counts[family] for family in static | times} == {4}
    assert (counts["total_power"], counts["power"], counts["least_power"]) == (2, 1, 0)
    assert all(1 <= counts[family] <= 3 for family in FAMILIES if family.startswith("staircase"))
