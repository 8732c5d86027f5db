"""The review page: its structure, that its numbers are the result's, and that nothing it quotes can act in it."""

from __future__ import annotations

import json
import math
import re
import time
from base64 import b64encode
from dataclasses import asdict, replace
from hashlib import sha256
from itertools import pairwise

import pytest
import report_samples as samples

from optopick.answers import Change, Share, Why
from optopick.report import page as page_module
from optopick.report.document import Document, InputFile, Walk
from optopick.report.explorer import walk_view
from optopick.report.labels import CHECKS, check_label
from optopick.report.page import page
from optopick.report.placed import placed_resistors
from optopick.report.words import amount, limit_words, room_words, standing
from optopick.result import Check, Rejected, Status, Timing

DOCUMENTS = {
    "plain": samples.plain,
    "full": samples.full,
    "nothing found": samples.nothing_found,
    "given": samples.given,
}
every_document = pytest.mark.parametrize("document", DOCUMENTS.values(), ids=DOCUMENTS)


@every_document
def test_structure(document):
    """Landmarks, one first heading, no level left out, anchors that lead somewhere, headings for every table cell."""
    root = samples.read(page(document()))
    html = root.one("html")
    assert html.attributes["lang"] == "en"
    for landmark in ("header", "main", "footer", "nav", "h1", "title"):
        assert len(html.all(landmark)) == 1 or landmark == "title"
    levels = [int(node.name[1]) for node in html.all() if re.fullmatch("h[1-6]", node.name)]
    assert levels[0] == 1
    assert all(after <= before + 1 for before, after in pairwise(levels))
    identities = [node.attributes["id"] for node in html.all() if "id" in node.attributes]
    assert len(identities) == len(set(identities))
    targets = [node.attributes["href"] for node in html.all("a")]
    assert targets
    assert all(target.startswith("#") and target[1:] in identities for target in targets)
    for node in html.all():
        for attribute in ("aria-labelledby", "for"):
            if attribute in node.attributes:
                assert node.attributes[attribute] in identities
    assert all(cell.attributes.get("scope") in ("col", "row") for cell in html.all("th"))
    assert html.all("a")[0].attributes["href"] == "#content"


@every_document
def test_self_contained(document):
    """Nothing is fetched: no address but the name space of SVG, no import, no image by address."""
    text = page(document())
    assert set(re.findall(r"https?://[^\"' )]+", text)) <= {"http://www.w3.org/2000/svg"}
    assert not re.search(r"@import|url\(|\bsrc=|<link(?! rel=\"icon\" href=\"data:,\")", text)


@every_document
def test_same_document_same_page(document):
    assert page(document()) == page(document())


def test_only_the_date_changes():
    before, after = page(samples.plain()), page(replace(samples.plain(), date="2031-12-24"))
    assert before != after
    assert before.replace("2026-01-15", "2031-12-24") == after


def test_checks_are_the_result_s():
    document = samples.plain()
    root = samples.read(page(document))
    rows = [row for row in root.all("tr") if "data-check" in row.attributes]
    assert [row.attributes["data-check"] for row in rows] == [check.name for check in document.review.checks]
    for row, check in zip(rows, document.review.checks, strict=True):
        value, limit = row.all("data")
        assert float(value.attributes["value"]) == check.value
        assert float(limit.attributes["value"]) == check.limit
        assert value.text == amount(check.value, check.unit)
        assert f"{'≤' if check.sense == '<=' else '≥'} {limit.text}" == limit_words(check)
        assert row.all("th")[0].text == check_label(check.name)
        assert row.all("span")[0].text == room_words(check)
        assert row.children[-1].text == check.corner


def test_times_and_power_are_the_result_s():
    document = samples.plain()
    root = samples.read(page(document))
    shown = {row.attributes["data-time"]: row for row in root.all("tr") if "data-time" in row.attributes}
    for name, value in asdict(document.review.timing).items():
        assert float(shown[name].one("data").attributes["value"]) == value
        assert shown[name].one("data").text == amount(value, "s")
    for name, value in asdict(document.review.power).items():
        assert float(root.one("tr", data_power=name).one("data").attributes["value"]) == value


def test_goals_are_the_result_s():
    document = samples.plain()
    root = samples.read(page(document))
    for goal in document.objectives:
        values = [float(node.attributes["value"]) for node in root.one("tr", data_goal=goal.name).all("data")]
        assert values == [goal.value, goal.bound, goal.gap]


def test_resistors_are_the_design_s():
    document = samples.plain()
    values = [float(node.attributes["value"]) for node in samples.read(page(document)).all("data")]
    for one in placed_resistors(document.brief, document.review.design):
        assert getattr(document.review.design, one.position) == one.ohms
        at = values.index(one.ohms)
        assert values[at : at + 4] == [one.ohms, one.tolerance, one.power, one.voltage]


def test_sections_only_where_there_is_something():
    headings = {name: _headings(make()) for name, make in DOCUMENTS.items()}
    optional = {"Margin budget", "Simulated", "Neighbouring values", "Trade-off"}
    assert optional <= set(headings["full"])
    assert not optional & set(headings["plain"])
    assert {"Design", "Checks", "Timing and power", "Formulas"} <= set(headings["given"])
    assert "Proof" not in headings["given"]
    assert headings["nothing found"] == ["Cautions", "Requirement", "Couplers", "Proof", "Inputs"]
    for name, make in DOCUMENTS.items():
        assert ("<script" in page(make())) == (name == "full")


def _headings(document: Document) -> list[str]:
    return [node.text for node in samples.read(page(document)).all("h2")]


def test_verdicts():
    assert "Least delay: 31.4 µs; then least power: 7.5 mW (proved)</p>" in page(samples.plain())
    assert "No combination in stock holds every limit at every corner." in page(samples.nothing_found())
    found = samples.given().review
    assert f"The given design: {len(found.failing)} of {len(found.checks)} checks fail." in page(samples.given())
    late = page(replace(samples.plain(), status=Status.FEASIBLE))
    assert "best found in the time given; no design has delay below 31.3 µs and no design has power" in late


def test_trade_off():
    """Every point of the front with its two goals; the document's design and the knee are named."""
    document = samples.full()
    section = samples.read(page(document)).one("section", aria_labelledby="tradeoff")
    rows = section.all("tr")[1:]
    assert len(rows) == len(document.front.points)
    for k, (row, point) in enumerate(zip(rows, document.front.points, strict=True)):
        assert [float(node.attributes["value"]) for node in row.all("data")] == [point.first, point.second]
        assert ("(this design)" in row.text) == (point.review.design == document.review.design) == (k == 1)
        assert ("(knee)" in row.text) == (k == document.front.knee)
    elsewhere = replace(document, front=replace(document.front, points=document.front.points[:1], knee=None))
    assert "(this design)" not in samples.read(page(elsewhere)).one("section", aria_labelledby="tradeoff").text


def test_ranking():
    document = samples.full()
    section = samples.read(page(document)).one("section", aria_labelledby="couplers")
    ranked, rejected = section.all("table")
    (row,) = ranked.all("tr")[1:]
    one = document.ranking.ranked[0]
    assert row.all("th")[0].text == one.coupler.part
    values = [float(node.attributes["value"]) for node in row.all("data")]
    assert values == [one.objective.value, one.second.value]
    assert [cell.text for cell in rejected.all("tr")[1].children] == ["INV-8", "working 300 below 600"]
    assert "1 more of the table is not among the couplers" in page(samples.plain())


def test_budget():
    """The hungriest cause first, small ones unsaid, a room that is no number as a dash."""
    costs = {"CTR bin": 0.02, "ageing": 0.5, "resistors": 1e-5}
    shares = (Share("delay", 0.25, 0.8, costs), Share("creepage", math.nan, math.nan, {"CTR bin": math.nan}))
    section = samples.read(page(replace(samples.plain(), budget=shares))).one("section", aria_labelledby="budget")
    first, second = ([cell.text for cell in row.children] for row in section.all("tr")[1:])
    assert first == ["Delay", "25 %", "", "80 %", "ageing 50 %, CTR bin 2 %"]
    assert second == ["Creepage", "–", "", "–", "nothing"]


def test_contradictions():
    why = Why(
        Status.INFEASIBLE, (("delay", "ctr_margin"),), (Change("limits.delay", "s", 1e-6, 2e-6),), False, None, ()
    )
    root = samples.read(page(replace(samples.nothing_found(), why=why)))
    section = root.one("section", aria_labelledby="why")
    assert section.one("li").text == "Delay, CTR margin"
    assert [node.text for node in section.all("data")] == ["1 µs", "2 µs"]


HOSTILE = "<script>alert(1)</script><img src=x onerror=alert(2)>\"'&]]>--></style></title></pre>"


def test_hostile_text_stays_text():
    """Text from files turns up as text wherever it is shown, and the page's elements stay the same."""
    text = page(_hostile(samples.full()))
    assert "<img" not in text
    assert text.count("<script") == 2
    assert HOSTILE not in text
    root = samples.read(text)
    assert root.one("h1").text == HOSTILE
    assert root.all("title")[0].text.startswith(HOSTILE)
    assert HOSTILE in root.all("pre")[0].text
    names = [node.name for node in samples.read(page(samples.full())).all()]
    assert [node.name for node in root.all()] == names


def _hostile(document: Document) -> Document:
    """The same document with hostile text wherever text comes from outside."""
    design = replace(document.review.design, coupler=HOSTILE)
    checks = tuple(replace(check, corner=HOSTILE if check.corner else "") for check in document.review.checks)
    found = replace(document.review, design=design, checks=checks)
    walks = tuple(
        replace(
            walk, points=tuple(replace(point, design=replace(point.design, coupler=HOSTILE)) for point in walk.points)
        )
        for walk in document.walks
    )
    return replace(
        document,
        brief=replace(document.brief, title=HOSTILE),
        coupler=replace(document.coupler, part=HOSTILE, maker=HOSTILE, sheet=HOSTILE),
        review=found,
        walks=walks,
        front=replace(
            document.front,
            points=tuple(replace(p, review=found) if k == 1 else p for k, p in enumerate(document.front.points)),
        ),
        ranking=replace(
            document.ranking,
            ranked=tuple(replace(one, coupler=replace(one.coupler, part=HOSTILE)) for one in document.ranking.ranked),
            rejected=(Rejected(HOSTILE, HOSTILE),),
        ),
        assumed=tuple(replace(one, parameter=HOSTILE, value=HOSTILE, rule=HOSTILE) for one in document.assumed),
        cautions=(HOSTILE,),
        brief_file=InputFile(HOSTILE, HOSTILE.encode()),
        table_file=InputFile(HOSTILE, HOSTILE.encode()),
        version=HOSTILE,
        date=HOSTILE,
    )


def test_only_the_page_s_own_script_may_run():
    root = samples.read(page(samples.full()))
    script = root.all("script")[1]
    digest = b64encode(sha256("".join(script.children).encode()).digest()).decode()
    policy = root.one("meta", http_equiv="Content-Security-Policy").attributes["content"]
    assert f"script-src 'sha256-{digest}'" in policy
    assert policy.startswith("default-src 'none'")
    plain = samples.read(page(samples.plain()))
    assert "script-src" not in plain.one("meta", http_equiv="Content-Security-Policy").attributes["content"]


def test_inputs_with_checksums():
    document = samples.plain()
    root = samples.read(page(document))
    shown = [node.text for node in root.all("code", class_="checksum")]
    assert shown == [sha256(file.content).hexdigest() for file in samples.FILES]
    assert [node.text for node in root.all("pre")] == [file.text.strip().replace("\n", " ") for file in samples.FILES]


def test_a_table_too_long_to_quote():
    """The heading and the line that was used are quoted, and the page says so."""
    lines = ["# invented", "part,kind"] + [f"INV-{k},{'x' * 90}" for k in range(20_000)]
    document = samples.plain()
    table = InputFile("long.csv", "\n".join(lines).encode())
    long = replace(document, table_file=table, coupler=replace(document.coupler, row=9))
    quoted = samples.read(page(long)).all("pre")[1].text
    assert quoted == f"[20002 lines, too long to quote; the heading and the line used:] part,kind {lines[8]}"


# ---- the explorer -----------------------------------------------------------------------------------------------


def test_explorer_data_are_the_reviews():
    """Every text the script shows stands in the data, and is what the review says."""
    document = samples.full()
    root = samples.read(page(document))
    data = json.loads(root.one("script", type="application/json").children[0])
    assert [walk["id"] for walk in data["walks"]] == ["r-load", "r-be", "front"]
    for shown, walk in zip(data["walks"], document.walks, strict=True):
        assert shown["chosen"] == walk.chosen
        for point, found in zip(shown["points"], walk.points, strict=True):
            assert point["standing"] == standing(found)
            assert point["holds"] == found.passed
            times = [amount(value, "s") for value in asdict(found.timing).values()]
            assert point["times"] == [*times, amount(found.power.worst, "W")]
            for check, (name, value, limit, room, corner, state, begin, length) in zip(
                found.checks, point["checks"], strict=True
            ):
                words = [data["texts"][k] for k in (name, value, limit, room, corner)]
                told = [check_label(check.name), amount(check.value, check.unit), limit_words(check), room_words(check)]
                assert words == [*told, check.corner]
                assert (state == "fails") == (not check.passed)
                assert 0 <= begin <= begin + length <= 100.1


def test_explorer_s_cursor_is_where_the_plot_has_the_value():
    """The places for the cursor are those of the plot's own points; an empty position has none."""
    document = samples.full()
    root = samples.read(page(document))
    data = json.loads(root.one("script", type="application/json").children[0])
    for shown, walk in zip(data["walks"][:2], document.walks[:2], strict=True):
        figure = root.one("div", data_walk=shown["id"])
        line = figure.all("polyline")[0].attributes["points"].split()
        across = [float(pair.split(",")[0]) / 10 for pair in line]
        places = [place for place in shown["cursors"] if place is not None]
        assert places[: len(across)] == pytest.approx(across, abs=0.01)
        assert figure.one("line", class_="cursor").attributes["x1"] == f"{shown['cursors'][walk.chosen]:g}%"
        assert (shown["cursors"][-1] is None) == (walk.position == "r_be")


def test_sweep_plot_shows_the_tightest_checks_that_move():
    document = samples.full()
    plot = walk_view(document.walks[0]).plot
    shown = [node.text for node in samples.read(plot).all("text") if node.text in CHECKS.values()]
    rooms = {
        check.name: [next(c.margin for c in point.checks if c.name == check.name) for point in document.walks[0].points]
        for check in document.walks[0].points[0].checks
    }
    moving = sorted((min(room), name) for name, room in rooms.items() if max(room) - min(room) > 0.005)
    assert shown == [CHECKS[name] for _, name in moving[:5]]
    assert 2 < len(shown) < len(rooms)


def test_a_walk_finds_the_design():
    """A walk that does not say where the design is shows it all the same, if it is there."""
    document = samples.full()
    walks = (replace(document.walks[0], chosen=None), document.walks[2])
    root = samples.read(page(replace(document, walks=walks)))
    data = json.loads(root.one("script", type="application/json").children[0])
    assert [walk["chosen"] for walk in data["walks"]] == [2, None]


def test_explorer_s_plain_table():
    """Without a script each point is a row: its value, its verdict, its times."""
    document = samples.full()
    root = samples.read(page(document))
    for walk in document.walks:
        details = root.one("details", data_walk=walk.position.replace("_", "-"))
        assert "open" in details.attributes
        rows = details.all("tr")[1:]
        assert len(rows) == len(walk.points)
        for k, (row, found) in enumerate(zip(rows, walk.points, strict=True)):
            assert ("(this design)" in row.all("th")[0].text) == (k == walk.chosen)
            assert row.all("td")[0].text == standing(found)
            assert row.all("td")[1].text == amount(found.timing.edge_on, "s")


def test_numbers_that_are_none():
    """Checks without a number and endless times are said, and the data stay JSON."""
    document = samples.full()
    odd = (Check("creepage", math.nan, 6e-3, ">=", "m", ""), Check("delay", math.inf, 1e-3, "<=", "s", "somewhere"))
    timing = Timing(math.inf, math.inf, 1e-6, math.inf, math.inf, math.nan)
    found = replace(document.review, checks=(*document.review.checks, *odd), timing=timing)
    walks = tuple(replace(walk, points=(*walk.points, found)) for walk in document.walks)
    root = samples.read(page(replace(document, review=found, walks=walks)))
    rows = {row.attributes["data-check"]: row for row in root.all("tr") if "data-check" in row.attributes}
    assert rows["creepage"].all("span")[0].text == "fails"
    assert rows["creepage"].all("data")[0].text == "n/a"
    assert "no finite time at the worst corner" in root.one("section", aria_labelledby="timing").text
    data = json.loads(root.one("script", type="application/json").children[0])
    assert data["walks"][0]["points"][-1]["times"][0] == "∞"


def test_largest_page_is_quick_and_small():
    """Three positions at E96 over two decades, every value of every check new, and a long table: 2 s, 3 MB."""
    walks = tuple(_long_walk(position, 192) for position in ("r_led", "r_load", "r_be"))
    table = InputFile("long.csv", b"x" * (page_module.QUOTED_MOST - 1))
    document = replace(samples.full(), walks=walks, table_file=table)
    page(samples.full())  # imports and templates are loaded once a process
    assert len(page(document).encode()) < 3_000_000
    # the best of a few tries: a machine that is busy with other things says nothing about the page
    assert min(_seconds(document) for _ in range(4)) < 2.0


def _seconds(document: Document) -> float:
    """Time to build a page with no text remembered from before [s]."""
    amount.cache_clear()
    started = time.process_time()
    page(document)
    return time.process_time() - started


def _long_walk(position: str, count: int) -> Walk:
    base = samples.reviewed()
    points = []
    for k in range(count):
        stretch = 1 + k / 1000 + 0.1 * len(position)
        checks = tuple(replace(check, value=check.value * stretch) for check in base.checks)
        times = Timing(*(value * stretch for value in asdict(base.timing).values()))
        design = replace(base.design, **{position: 100.0 * 1.02**k})
        points.append(replace(base, design=design, checks=checks, timing=times))
    return Walk(position, tuple(points), 0)


def test_document_wants_review_and_coupler_together():
    document = samples.plain()
    with pytest.raises(ValueError, match="go together"):
        replace(document, coupler=None)
    with pytest.raises(ValueError, match="INV-7"):
        replace(document, coupler=replace(document.coupler, part="other"))
