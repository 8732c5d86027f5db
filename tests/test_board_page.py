"""The page of a board says what the answer says, needs nothing else, and has what there is to show."""

from __future__ import annotations

import csv
import json
import re
from dataclasses import replace
from hashlib import sha256

import board_samples as samples
import pytest
from report_samples import read

from optopick.board_answers import Packages
from optopick.read_board import read_board
from optopick.report.board_bill import board_bill
from optopick.report.board_page import alike, board_page, reels
from optopick.report.board_words import gave_words
from optopick.report.labels import check_label
from optopick.report.words import amount, ohms_words, room_words, tightest
from optopick.uses.board import solve_board
from optopick.uses.board_documents import board_files, document_of_board

every_document = pytest.mark.parametrize("made", samples.DOCUMENTS.values(), ids=samples.DOCUMENTS)


@every_document
def test_self_contained_and_well_formed(made):
    text = board_page(made())
    assert set(re.findall(r"https?://[^\"' )]+", text)) <= {"http://www.w3.org/2000/svg"}
    assert not re.search(r"@import|url\(|\bsrc=|<script|<link(?! rel=\"icon\" href=\"data:,\")", text)
    root = read(text)
    assert root.one("h1").text == "Two <links> & more"
    anchors = [link.attributes["href"] for link in root.one("nav").all("a")]
    assert anchors == [f"#{node.attributes['id']}" for node in root.one("main").all("h2")[1:]]


@every_document
def test_same_document_same_page(made):
    before, after = board_page(made()), board_page(replace(made(), date="2031-12-24"))
    assert before == board_page(made())
    assert before.replace("2026-01-15", "2031-12-24") == after


def headings(document) -> list[str]:
    return [node.text for node in read(board_page(document)).all("h2")]


def test_sections_only_where_there_is_something():
    designed = ["Links", "Reels", "Couplers and packages", "Bill of materials", "Checks", "Assumed", "Proof", "Inputs"]
    assert headings(samples.full()) == ["Cautions", "Limits and goals", *designed]
    without = ["Cautions", "Limits and goals", "What contradicts", "Links", "Proof", "Inputs"]
    assert headings(samples.contradicting()) == headings(samples.hopeless()) == without


def exact(node) -> list[float]:
    return [float(one.attributes["value"]) for one in node.all("data")]


def test_links_are_the_answer_s():
    document = samples.full()
    root = read(board_page(document))
    for one in document.result.links:
        row = root.one("tr", data_link=one.link.name)
        assert exact(row) == [one.power, one.alone]
        assert row.all("th")[0].text == f"{one.link.name} {one.link.brief.path.name}"
        for words in (f"{one.link.count} ×", one.review.design.coupler, gave_words(one)):
            assert words in row.text
    assert exact(root.one("tr", class_="total")) == [document.result.power, document.result.alone]


def test_goals_and_limits_are_the_answer_s():
    document = samples.full()
    root = read(board_page(document))
    for goal in document.result.goals:
        assert exact(root.one("tr", data_goal=goal.name)) == [goal.value, goal.bound, goal.gap]
    rows = {row.all("th")[0].text: row for row in root.all("table")[0].all("tr")[1:]}
    assert exact(rows["Distinct resistances"]) == [len(document.result.reels)]
    assert "≤ 5" in rows["Distinct resistances"].text
    assert exact(rows["Coupler packages placed"]) == [document.result.placed]
    assert exact(rows["Power of all links, worst case"]) == [document.result.power]
    assert rows["Power of all links, worst case"].text.endswith("none")


def test_a_limit_that_is_used_up_is_said_to_be():
    result = samples.full().result
    for limit, said in ((len(result.reels), True), (len(result.reels) + 1, False)):
        document = samples.full()
        limits = replace(document.board.limits, reels=limit)
        text = board_page(replace(document, board=replace(document.board, limits=limits)))
        row = next(one for one in read(text).all("tr") if one.text.startswith("Distinct resistances"))
        assert ("used up" in row.text) == said


def test_every_check_of_every_link_is_there():
    document = samples.full()
    root = read(board_page(document))
    told = alike(document.result)
    assert sorted(link.link.name for one in told for link in one.links) == ["first", "second", "third"]
    for one in told:
        part = root.one("div", data_links="; ".join(link.link.name for link in one.links))
        first, every = part.all("table")
        margins = {check.name: check.margin for check in one.review.designed}
        shown = [row.attributes["data-check"] for row in first.all("tr")[1:]]
        assert shown == sorted(margins, key=margins.__getitem__)[:3]
        assert shown[0] == tightest(one.review).name
        assert every in part.one("details").all("table")
        rows = every.all("tr")[1:]
        for row, check in zip(rows, one.review.checks, strict=True):
            assert exact(row) == [check.value, check.limit]
            assert row.all("th")[0].text == check_label(check.name)
            assert row.all("span")[0].text == room_words(check)
            assert row.children[-1].text == check.corner


def test_links_of_one_brief_are_told_together():
    names = [[link.link.name for link in one.links] for one in alike(samples.full().result)]
    assert names == [["first", "third"], ["second"]]


def test_reels_are_those_of_the_bill():
    document = samples.full()
    bill = list(csv.DictReader(board_bill(document.result).splitlines()))
    bought = {line["value"]: int(line["quantity"]) for line in bill}
    found = reels(document.result)
    assert {ohms_words(one.ohms): one.pieces for one in found}.items() <= bought.items()
    used = next(line["used"].split("; ") for line in bill if line["value"] == ohms_words(found[0].ohms))
    named = [name for _, names in found[0].used for name in names.split("; ")]
    assert [name.split(" (")[0] for name in named] == [use.rsplit(" ", 1)[0] for use in used]
    text = read(board_page(document)).text
    for one in found:
        assert all(f"{symbol}: {names}" in text for symbol, names in one.used)


def test_pieces_in_series_are_counted():
    document = samples.full()
    links = [
        replace(one, review=replace(one.review, design=replace(one.review.design, pieces=2)))
        for one in document.result.links
    ]
    doubled = replace(document.result, links=tuple(links))
    before, after = (sum(one.pieces for one in reels(result)) for result in (document.result, doubled))
    assert after - before == sum(one.link.count for one in links)
    assert any("first (3 × 2)" in names for one in reels(doubled) for _, names in one.used)


def test_packages_add_up_and_changes_are_told():
    document = samples.full()
    root = read(board_page(document))
    (table,) = (one for one in root.all("table") if one.text.startswith("Packages placed"))
    counts = [int(row.all("td")[0].text.removesuffix(" ×")) for row in table.all("tr")[1:]]
    assert sum(counts) == document.result.placed
    assert "field and logic" in table.text
    assert "signal.lit = 0.1" in root.one("dl", class_="facts changes").text


def test_packages_that_are_not_shared_are_told_together():
    document = samples.full()
    part = document.result.couplers[0]
    own = [Packages(part, 2, count, ((name, count),), None) for name, count in (("first", 3), ("third", 1))]
    shared = Packages(part, 2, 7, (("second", 14),), ("field", "logic"))
    text = board_page(replace(document, result=replace(document.result, packages=(own[0], shared, own[1]))))
    (table,) = (one for one in read(text).all("table") if one.text.startswith("Packages placed"))
    rows = [[cell.text for cell in row.all("td")] for row in table.all("tr")[1:]]
    assert rows == [["4 ×", "2", "not shared", "first (3); third (1)"], ["7 ×", "2", "field and logic", "second (14)"]]


def test_the_inputs_are_the_files(tmp_path):
    board = read_board(samples.written(tmp_path))
    document = document_of_board(board, solve_board(board), "2026-01-15")
    assert [one.file.name for one in document.files] == ["board.toml", "one.toml", "two.toml", "tiny.csv"]
    text = board_page(document)
    for one in document.files:
        assert sha256((tmp_path / one.file.name).read_bytes()).hexdigest() in text


def test_what_contradicts():
    document = samples.contradicting()
    (needed,) = document.result.conflict
    root = read(board_page(document))
    row = root.one("section", aria_labelledby="conflict").all("tr")[1]
    assert row.text.startswith("Reels")
    assert f"at least {needed.least:.0f}" in row.text
    text = read(board_page(samples.hopeless())).one("section", aria_labelledby="conflict").text
    assert "No design even alone: second." in text


@pytest.mark.parametrize(("limits", "there"), [("", {"bom.csv"}), ("reels = 2", set())])
def test_the_files_of_a_review(tmp_path, limits, there):
    board = read_board(samples.written(tmp_path, limits))
    result = solve_board(board)
    files = board_files(board, result, "2026-01-15")
    assert set(files) == {"review.html", "board.json", *there}
    assert json.loads(files["board.json"])["status"] == result.status.value
    assert "2026-01-15" in files["review.html"]
    if there:
        assert files["bom.csv"] == board_bill(result)
        assert amount(result.power, "W") in files["review.html"]
