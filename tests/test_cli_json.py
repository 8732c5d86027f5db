"""What `--json` prints: one object with the documented fields, in SI."""

from __future__ import annotations

from itertools import pairwise
from typing import Any

import pytest
from cli_links import ASSUMED, CHECK, FIELDS, RESULT, REVIEW, SOUND, TINY, UNSOUND, impossible, json_of
from command import ROOT, run

import optopick


@pytest.fixture(scope="module")
def picked() -> dict[str, Any]:
    return json_of(run("pick", ROOT / "examples" / "shortlist.toml", "--json"))


class TestJson:
    def test_pick_has_every_field(self, picked):
        assert set(picked) >= RESULT
        for name, fields in FIELDS.items():
            assert set(picked[name]) >= fields, name
        assert set(picked["second"]) >= FIELDS["objective"]
        assert all(set(check) == CHECK for check in picked["checks"])
        assert picked["assumed"]
        assert all(set(one) == ASSUMED for one in picked["assumed"])
        assert all(set(one) == {"part", "reason"} for one in picked["rejected"])

    def test_pick_is_what_python_gives(self, picked):
        result = optopick.pick(ROOT / "examples" / "shortlist.toml")
        assert picked["status"] == result.status.value == "optimal"
        assert picked["design"]["coupler"] == result.design.coupler
        assert picked["design"]["r_led"] == result.design.r_led
        assert picked["design"]["r_be"] is None
        assert picked["objective"]["value"] == result.objective.value
        assert [check["name"] for check in picked["checks"]] == [check.name for check in result.review.checks]

    def test_gap_is_value_over_bound(self, picked):
        for name in ("objective", "second"):
            one = picked[name]
            assert one["gap"] == pytest.approx(1 - one["bound"] / one["value"])

    def test_checks_are_in_si(self, picked):
        checks = {check["name"]: check for check in picked["checks"]}
        assert checks["withstand"]["limit"] == 3750.0
        assert checks["creepage"]["limit"] == pytest.approx(6e-3)
        assert checks["edge_time"]["limit"] == pytest.approx(150e-6)
        for check in checks.values():
            room = check["limit"] - check["value"] if check["sense"] == "<=" else check["value"] - check["limit"]
            assert check["margin"] == pytest.approx(room / check["limit"])
            assert check["passed"] == (check["margin"] >= -1e-9)

    def test_next_best(self):
        found = json_of(run("pick", TINY, "--json", "--next", "2", "--differ", "value"))
        assert set(found) == RESULT | {"next"}
        designs = [found["design"], *(one["design"] for one in found["next"])]
        goals = [found["objective"]["value"], *(one["objective"]["value"] for one in found["next"])]
        assert len(designs) == 3
        assert all(one != other for one, other in pairwise(designs))
        assert goals == sorted(goals)

    def test_check(self):
        found = json_of(run("check", TINY, *UNSOUND, "--json"))
        assert set(found) >= {"status", "notes", "assumed", "cautions", "nearest", *REVIEW}
        assert found["status"] == "fails"
        assert found["notes"][0] == "r_led, 10 kΩ, is not in the stock (3 values listed in the brief)"
        assert set(found["nearest"]) >= {"changed", *REVIEW}
        assert all(check["passed"] for check in found["nearest"]["checks"])
        assert json_of(run("check", TINY, *SOUND, "--json"))["status"] == "passes"

    def test_check_with_budget(self):
        found = json_of(run("check", TINY, *SOUND, "--budget", "--json"))
        assert {share["check"] for share in found["budget"]} == {check["name"] for check in found["checks"]}

    def test_rank(self):
        found = json_of(run("rank", ROOT / "examples" / "shortlist.toml", "--json", "--workers", "1"))
        assert set(found) >= {"complete", "ranked", "rejected"}
        assert found["complete"] is True
        goals = [one["objective"]["value"] for one in found["ranked"]]
        assert len(goals) >= 2
        for one in found["ranked"]:
            assert set(one) >= {"status", "objective", "second", "tightest", "price", *REVIEW}
            # a rating of the part that just suffices is no tight design
            designed = [
                check for check in one["checks"] if check["name"] not in ("withstand", "working_voltage", "creepage")
            ]
            assert one["tightest"]["margin"] == min(check["margin"] for check in designed)

    def test_tradeoff(self):
        found = json_of(run("tradeoff", TINY, "--json"))
        assert set(found) >= {"goals", "complete", "knee", "points"}
        assert found["goals"] == ["edge time", "power"]
        firsts, seconds = ([point[name] for point in found["points"]] for name in ("first", "second"))
        assert len(firsts) >= 2
        assert firsts == sorted(firsts)
        assert seconds == sorted(seconds, reverse=True)

    def test_why_of_the_impossible(self, tmp_path):
        found = json_of(run("why", impossible(tmp_path), "--json"))
        assert set(found) >= {"status", "conflicts", "changes", "complete", "objective", "worth"}
        assert found["status"] == "infeasible"
        assert any("power" in conflict for conflict in found["conflicts"])
        assert any(change["key"].endswith("power") for change in found["changes"])

    def test_why_of_the_possible(self):
        found = json_of(run("why", TINY, "--json"))
        assert found["status"] == "optimal"
        assert found["conflicts"] == []
        assert found["objective"]["name"] == "power"
