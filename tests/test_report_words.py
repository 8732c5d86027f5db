"""What reports say of a result, word by word."""

from __future__ import annotations

import math
from dataclasses import replace

import pytest
import report_samples as samples

from optopick.brief import DriveCircuit, Limits, Signal
from optopick.coupler import Assumed
from optopick.report.brief_words import requirement_parts
from optopick.report.words import (
    binding,
    limit_words,
    margin_words,
    ohms_words,
    proof_words,
    room_words,
    rule_words,
    set_aside,
    standing,
    tightest,
    verdict,
)
from optopick.result import NOT_CHOSEN, Check, Objective, Proof, Rejected, Status


@pytest.mark.parametrize(
    ("value", "sense", "words"),
    [
        (0.5, "<=", "50 %"),
        (0.95, "<=", "5.0 %"),
        (1.0, "<=", "0.0 %"),
        (1.05, "<=", "fails -5.0 %"),
        (3.0, "<=", "fails -200 %"),
        (3.0, ">=", "200 %"),
        (0.4, ">=", "fails -60 %"),
        (math.nan, ">=", "fails"),
        (math.inf, "<=", "fails"),
    ],
)
def test_room(value, sense, words):
    check = Check("delay", value, 1.0, sense, "s", "")
    assert room_words(check) == words
    assert limit_words(check) == f"{'≤' if sense == '<=' else '≥'} 1 s"


@pytest.mark.parametrize(
    ("margin", "digits", "words"),
    [
        (0.0999, None, "10.0 %"),
        (0.1, None, "10 %"),
        (-1e-10, None, "0.0 %"),
        (-1e-10, 0, "0 %"),
        (0.0834, 0, "8 %"),
        (2.5, 1, "250.0 %"),
        (9.99, None, "999 %"),
        (10.0, None, "> 1000 %"),
        (-1e12, 0, "< −1000 %"),
        (math.inf, None, "∞ %"),
        (-math.inf, 1, "–"),
        (math.nan, None, "–"),
    ],
)
def test_margin(margin, digits, words):
    """Infinities are no percentages, and nothing has less than no room by rounding alone."""
    assert margin_words(margin, digits) == words


def test_binding():
    """What holds with little room, the tightest first; what fails does not bind."""
    checks = tuple(
        Check(name, value, 1.0, "<=", "s", "")
        for name, value in (("a", 0.5), ("b", 0.95), ("c", 0.99), ("d", 1.2), ("e", math.nan), ("f", 1 + 1e-10))
    )
    assert [check.name for check in binding(replace(samples.reviewed(), checks=checks))] == ["f", "c", "b"]


def test_a_rating_of_the_part_does_not_count_as_tight():
    """The design has no say in it; where it fails it is told like any other."""
    rating = Check("withstand", 3750.0, 3750.0, ">=", "V", "")
    review = replace(samples.reviewed(), checks=(rating, Check("delay", 0.95, 1.0, "<=", "s", "")))
    assert [check.name for check in binding(review)] == ["delay"]
    assert tightest(review).name == "delay"
    assert tightest(replace(review, checks=(replace(rating, limit=5000.0), *review.checks[1:]))).name == "withstand"


def test_a_bound_that_is_none_is_not_told():
    told = verdict(Status.FEASIBLE, (Objective("delay", 1e-6, 0.0, "s"), Objective("power", 2e-3, 1e-3, "W")), None)
    assert told.endswith("(best found in the time given; no design has power below 1 mW)")
    assert verdict(Status.FEASIBLE, (Objective("delay", 1e-6, 0.0, "s"),), None).endswith("no bound shown in it)")


def test_a_rule_does_not_say_again_the_value_beside_it():
    assert rule_words(Assumed("A", "c_be", "14 pF", "14 pF (from memory)")) == "from memory"
    assert rule_words(Assumed("A", "c_be", "14 pF", "14 pFs at the most (from memory)")).startswith("14 pFs")
    assert rule_words(Assumed("A", "tau_0", "1 µs", "what is left (charge control)")) == "what is left (charge control)"


def test_ohms():
    assert ohms_words(4700.0) == "4.7 kΩ"
    assert ohms_words(None) == "none"


def test_standing():
    """The check with the least room is named; one without a number is worse than any."""
    good, tight, bad = (
        Check(name, value, 1.0, "<=", "s", "") for name, value in (("a", 0.1), ("b_c", 0.9), ("d", 1.5))
    )
    review = samples.reviewed()
    assert standing(replace(review, checks=(good, tight))) == "all checks hold; tightest: b c 10.0 %"
    assert standing(replace(review, checks=(good, bad))) == "1 of 2 checks fails; worst: d fails -50 %"
    assert standing(replace(review, checks=(bad, bad, good))).startswith("2 of 3 checks fail; ")
    lost = replace(good, value=math.nan)
    assert tightest(replace(review, checks=(bad, lost))) is lost


def test_verdict_of_a_given_design():
    review = samples.reviewed()
    held = replace(review, checks=(Check("a", 0.1, 1.0, "<=", "s", ""),))
    assert verdict(None, (), held) == "The given design: every check holds."
    lost = replace(held, checks=(*held.checks, Check("b", 1.5, 1.0, "<=", "s", "")))
    assert verdict(None, (), lost) == "The given design: 1 of 2 checks fails."
    assert verdict(Status.UNKNOWN, (), None) == "Out of time: no design found, and none ruled out."


def test_proof():
    proof = Proof(1_234_567, 3, 20, 1.234, "a solver")
    assert proof_words(Status.OPTIMAL, proof) == (
        "Of 1,234,567 combinations in stock no other does better; re-checked from the physics at every corner "
        "(3 solver calls, 20 settled by ranges alone, 1.2 s; a solver)."
    )
    assert "none holds every limit" in proof_words(Status.INFEASIBLE, proof)
    assert "not proved best" in proof_words(Status.FEASIBLE, proof)
    assert "1.2 s" not in proof_words(Status.OPTIMAL, proof, timed=False)


def test_set_aside():
    told = Rejected("A", "too slow")
    assert set_aside((told, Rejected("B", NOT_CHOSEN), Rejected("C", NOT_CHOSEN))) == ((told,), 2)


def test_requirement():
    """Each limit that the brief states is a row with its own value, and none else."""
    brief, _, _ = samples.link()
    limits = Limits(1.3, 1e-6, 2e-6, 3e-6, 4e-3, brief.limits.isolation, 1.5)
    parts = {part.name: dict(part.rows) for part in requirement_parts(replace(brief, limits=limits))}
    assert parts["Limits"] == {
        "CTR margin": "≥ 1.3",
        "Edge time": "≤ 1 µs",
        "Delay": "≤ 2 µs",
        "Pulse distortion": "≤ 3 µs",
        "Average power": "≤ 4 mW",
        "Guard on computed times": "× 1.5",
    }
    signal = replace(brief, signal=Signal(52e-6, 0.4))
    assert requirement_parts(signal)[0].rows == (("Shortest pulse", "52 µs"), ("LED lit", "40 % of the time"))
    assert parts["Drive"]["Drive voltage"] == "4.75 V to 5.25 V"
    assert parts["Stock"]["Base-emitter resistor"] == "E6, may stay empty"
    bare = replace(brief, limits=Limits(None, None, None, None, None, brief.limits.isolation, 1.0))
    assert dict(requirement_parts(bare)[4].rows) == {"Guard on computed times": "× 1"}


def test_requirement_of_a_field_input():
    brief, _, _ = samples.link()
    field = replace(brief.drive, circuit=DriveCircuit.FIELD, off_voltage=5.0, off_current=1.5e-3, on_current_min=2e-3)
    rows = dict(requirement_parts(replace(brief, drive=replace(field, reverse=30.0)))[1].rows)
    assert rows["Must be dark below"] == "5 V, and at 1.5 mA"
    assert rows["Input draws at least"] == "2 mA"
    assert rows["Reverse voltage"] == "30 V"
