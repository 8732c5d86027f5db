"""Board files: what is read from a right one, and exact messages for wrong ones, all at once."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest
from cli_links import TINY

from optopick.board import BoardGoal, BoardGoalName, BoardLimits
from optopick.errors import InputError
from optopick.read_board import read_board

GOOD = """\
title = "Two links"

[limits]
reels = 5
couplers = 2
power = "80 mW"

[goal]
minimize = "reels"
then = "power"
give = "5 %"

[[link]]
name = "first"
brief = "tiny.toml"
count = 3

[[link]]
name = "second"
brief = "tiny.toml"
"""


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    for name in ("tiny.toml", "tiny.csv"):
        (tmp_path / name).write_bytes(TINY.with_name(name).read_bytes())
    return tmp_path


def written(folder: Path, *changes: tuple[str, str], text: str = GOOD) -> Path:
    for old, new in changes:
        assert old in text, old
        text = text.replace(old, new, 1)
    path = folder / "board.toml"
    path.write_text(text, encoding="utf-8")
    return path


def mistakes_of(path: Path) -> list[str]:
    with pytest.raises(InputError) as caught:
        read_board(path)
    return [str(mistake).replace(f"{path.parent}/", "") for mistake in caught.value.mistakes]


def test_a_right_one(folder):
    board = read_board(written(folder))
    assert board.title == "Two links"
    assert board.limits == BoardLimits(reels=5, couplers=2, power=pytest.approx(0.08))
    assert board.goal == BoardGoal(BoardGoalName.REELS, BoardGoalName.POWER, pytest.approx(0.05))
    assert [(link.name, link.count) for link in board.links] == [("first", 3), ("second", 1)]
    assert {link.brief.title for link in board.links} == {"Golden model files"}


def test_what_may_be_left_out(folder):
    text = '[goal]\nminimize = "power"\n[[link]]\nname = "one"\nbrief = "tiny.toml"\n'
    board = read_board(written(folder, text=text))
    assert board.title == "board"
    assert board.limits == BoardLimits()
    assert board.goal == BoardGoal(BoardGoalName.POWER, BoardGoalName.REELS, 0.0)
    then = read_board(written(folder, ('"power"', '"couplers"'), text=text)).goal.then
    assert then is BoardGoalName.POWER


GOALS = 'one of "power", "reels", "couplers", "packages", "cost", "edge"'

WRONG = {
    "no reel": (
        ("reels = 5", "reels = 0"),
        "board.toml line 4, limits.reels: found 0; expected at least 1",
    ),
    "half a reel": (
        ("reels = 5", "reels = 5.5"),
        "board.toml line 4, limits.reels: found 5.5; expected a whole number such as 10",
    ),
    "wrong unit": (
        ('power = "80 mW"', 'power = "80 mA"'),
        'board.toml line 6, limits.power: found "80 mA"; expected a power such as "40 mW"',
    ),
    "no power": (
        ('power = "80 mW"', 'power = "0 W"'),
        'board.toml line 6, limits.power: found "0 W"; expected more than 0 W',
    ),
    "unknown limit": (
        ("couplers = 2", "coupler = 2"),
        "board.toml line 5, limits.coupler: found an unknown key; expected one of reels, couplers, packages, price, power"
        ' (did you mean "couplers"?)',
    ),
    "unknown section": (
        ("[limits]", "[limit]"),
        "board.toml line 3, limit: found an unknown section; expected one of title, limits, goal, link"
        ' (did you mean "limits"?)',
    ),
    "unknown goal": (
        ('minimize = "reels"', 'minimize = "reel"'),
        f'board.toml line 9, goal.minimize: found "reel"; expected {GOALS} (did you mean "reels"?)',
    ),
    "no goal": (
        ('minimize = "reels"\n', ""),
        f"board.toml: key goal.minimize: found nothing; expected minimize, {GOALS}",
    ),
    "twice the same goal": (
        ('then = "power"', 'then = "reels"'),
        'board.toml line 10, goal.then: found "reels"; expected another goal than minimize',
    ),
    "gives too much": (
        ('give = "5 %"', 'give = "500 %"'),
        'board.toml line 11, goal.give: found "500 %"; expected at least 0 % and at most 100 %',
    ),
    "no price": (
        ('power = "80 mW"', "price = 0"),
        "board.toml line 6, limits.price: found 0; expected more than 0",
    ),
    "a price in words": (
        ('power = "80 mW"', 'price = "dear"'),
        'board.toml line 6, limits.price: found "dear"; expected a number such as 4.5',
    ),
    "half a package": (
        ('power = "80 mW"', "packages = 2.5"),
        "board.toml line 6, limits.packages: found 2.5; expected a whole number such as 12",
    ),
    "one ground": (
        ("count = 3", 'grounds = ["field"]'),
        'board.toml line 16, link.1.grounds: found ["field"]; '
        "expected two names, the ground on the LED's side and the one on the output's",
    ),
    "the same ground": (
        ("count = 3", 'grounds = ["logic", "logic"]'),
        'board.toml line 16, link.1.grounds: found "logic" twice; expected each once',
    ),
    "a ground without a list": (
        ("count = 3", 'grounds = "logic"'),
        'board.toml line 16, link.1.grounds: found "logic"; expected a list of texts such as ["field", "logic"]',
    ),
    "no name": (
        ('name = "first"\n', ""),
        'board.toml: key link.1.name: found nothing; expected name, such as "motor on"',
    ),
    "empty name": (
        ('name = "first"', 'name = " "'),
        'board.toml line 14, link.1.name: found " "; expected text such as "motor on"',
    ),
    "one name twice": (
        ('name = "second"', 'name = "first"'),
        'board.toml line 19, link.2.name: found "first", the name of link 1 too; expected each name once',
    ),
    "no count": (
        ("count = 3", "count = 0"),
        "board.toml line 16, link.1.count: found 0; expected at least 1 and at most 10000",
    ),
    "count in words": (
        ("count = 3", 'count = "three"'),
        'board.toml line 16, link.1.count: found "three"; expected a whole number such as 8',
    ),
    "no brief": (
        ('name = "second"\nbrief = "tiny.toml"', 'name = "second"'),
        'board.toml: key link.2.brief: found nothing; expected brief, such as "motor.toml"',
    ),
    "no such brief": (
        ('name = "second"\nbrief = "tiny.toml"', 'name = "second"\nbrief = "none.toml"'),
        'board.toml line 20, link.2.brief: found "none.toml", where there is no file; '
        "expected a file, its path relative to the board file's folder",
    ),
    "unknown key of a link": (
        ("count = 3", "number = 3"),
        'board.toml line 16, link.1.number: found an unknown key; expected one of name, brief, count, unset, grounds, set (did you mean "name"?)',
    ),
    "one bracket": (
        ('[[link]]\nname = "first"\nbrief = "tiny.toml"\ncount = 3\n\n[[link]]', "[link]"),
        "board.toml line 13, link: found a table; expected a table [[link]] for each link, with name and brief",
    ),
}


@pytest.mark.parametrize("name", WRONG)
def test_one_mistake(folder, name):
    change, message = WRONG[name]
    assert mistakes_of(written(folder, change)) == [message]


@pytest.mark.parametrize("which", ["minimize", "then"])
def test_edges_without_any_limit(folder, which):
    brief = (folder / "tiny.toml").read_text(encoding="utf-8")
    (folder / "tiny.toml").write_text(brief.replace("edge_time", "#edge_time"), encoding="utf-8")
    goals = {"minimize": "power", "then": "reels"} | {which: "edge"}
    text = "[goal]\n" + "".join(f'{name} = "{goal}"\n' for name, goal in goals.items())
    link = '[[link]]\nname = "one"\nbrief = "tiny.toml"\n'
    line = 2 if which == "minimize" else 3
    assert mistakes_of(written(folder, text=text + link)) == [
        f'board.toml line {line}, goal.{which}: found "edge"; '
        "expected another goal, or a link whose brief has limits.edge_time"
    ]
    limited = link + 'set.limits.edge_time = "9 us"\n'
    assert read_board(written(folder, text=text + limited)).links[0].brief.limits.edge_time


def test_grounds(folder):
    text = GOOD.replace("count = 3", 'grounds = ["field", "logic"]')
    assert [link.grounds for link in read_board(written(folder, text=text)).links] == [("field", "logic"), None]


def test_all_at_once_in_the_order_of_the_file(folder):
    changes = [WRONG[name][0] for name in ("no reel", "unknown goal", "one name twice", "count in words")]
    assert mistakes_of(written(folder, *changes)) == [
        WRONG["no reel"][1],
        WRONG["unknown goal"][1],
        WRONG["count in words"][1],
        WRONG["one name twice"][1],
    ]


def test_mistakes_of_a_brief_come_too_and_once(folder):
    brief = (folder / "tiny.toml").read_text(encoding="utf-8")
    (folder / "tiny.toml").write_text(brief.replace("lit = 0.5", "lit = 7"), encoding="utf-8")
    found = mistakes_of(written(folder, ("reels = 5", "reels = 0")))
    assert len(found) == 2
    assert found[0] == WRONG["no reel"][1]
    assert found[1].startswith("tiny.toml line 6, signal.lit: found 7; expected ")


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("", "board.toml: found an empty file; expected a board in TOML"),
        (
            '[goal]\nminimize = "power"\n',
            "board.toml: key link: found no link; expected a table [[link]] for each link, with name and brief",
        ),
        (
            'link = 3\n[goal]\nminimize = "power"\n',
            "board.toml line 1, link: found 3; expected a table [[link]] for each link, with name and brief",
        ),
        (
            'goal = "power"\n[[link]]\nname = "one"\nbrief = "tiny.toml"\n',
            'board.toml line 1, goal: found "power"; expected a section, [goal]',
        ),
        (
            'title = "one\n',
            'board.toml line 1, column 13: found title = "one; expected a closing quote, " or \', where the text ends',
        ),
    ],
)
def test_a_file_that_is_no_board(folder, text, message):
    assert mistakes_of(written(folder, text=text)) == [message]


def test_no_such_file(tmp_path):
    assert mistakes_of(tmp_path / "none.toml") == ["none.toml: found no such file; expected a board in TOML"]


def test_sections_may_stand_behind_the_links(folder):
    text = '[[link]]\nname = "one"\nbrief = "tiny.toml"\n\n[goal]\nminimize = "least"\n\n[limits]\nreels = -1\n'
    assert mistakes_of(written(folder, text=text)) == [
        f'board.toml line 6, goal.minimize: found "least"; expected {GOALS}',
        "board.toml line 9, limits.reels: found -1; expected at least 1",
    ]


# ---- keys of the brief that a link changes ---------------------------------------------------------------------------

CHANGED = """\
[goal]
minimize = "power"
[[link]]
name = "plain"
brief = "tiny.toml"
[[link]]
name = "inline"
brief = "tiny.toml"
set = { signal = { lit = 0.3 }, limits = { edge_time = "5 us" } }
[[link]]
name = "dotted"
brief = "tiny.toml"
set.signal.lit = 0.3
set.limits.edge_time = "5 us"
[[link]]
name = "tables"
brief = "tiny.toml"
unset = ["limits.delay", "stock.r_be"]
[link.set.stock.r_be]
series = "E6"
from = "100k"
to = "1M"
[[link]]
name = "behind"
brief = "tiny.toml"
"""


def test_changes(folder):
    plain, inline, dotted, tables, behind = read_board(written(folder, text=CHANGED)).links
    assert inline.brief.signal.lit == 0.3
    assert inline.brief.limits.edge_time == pytest.approx(5e-6)
    kept = replace(inline.brief, signal=plain.brief.signal, limits=plain.brief.limits)
    assert kept == plain.brief == behind.brief
    assert inline.brief == dotted.brief
    assert inline.changes == dotted.changes == (("signal.lit", "0.3"), ("limits.edge_time", '"5 us"'))
    assert tables.brief.limits.delay is None
    assert tables.brief.stock.r_be.values == (100e3, 150e3, 220e3, 330e3, 470e3, 680e3, 1e6)
    assert ("limits.delay", None) in tables.changes
    assert plain.changes == ()


def test_a_path_starts_at_the_board(folder):
    """A table named by the board stands beside the board, one named by the brief beside the brief."""
    (folder / "briefs").mkdir()
    for name in ("tiny.toml", "tiny.csv"):
        (folder / name).rename(folder / "briefs" / name)
    (folder / "own.csv").write_bytes((folder / "briefs" / "tiny.csv").read_bytes())
    text = CHANGED[: CHANGED.index("[[link]]")]
    text += '[[link]]\nname = "a"\nbrief = "briefs/tiny.toml"\nset.couplers.table = "own.csv"\n'
    text += '[[link]]\nname = "b"\nbrief = "briefs/tiny.toml"\nset.signal.lit = 0.1\n'
    one, other = read_board(written(folder, text=text)).links
    assert one.brief.couplers.table.samefile(folder / "own.csv")
    assert other.brief.couplers.table.samefile(folder / "briefs" / "tiny.csv")


WRONG_CHANGES = {
    "a value": (
        "set = { signal = { lit = 7 } }",
        "line 6, link.1.set.signal.lit: found 7; expected at least 0 and at most 1",
    ),
    "a dotted value": (
        "set.signal.lit = 7",
        "line 6, link.1.set.signal.lit: found 7; expected at least 0 and at most 1",
    ),
    "a key": (
        'set.limits.edge = "5 us"',
        "line 6, link.1.set.limits.edge: found an unknown key; expected one of ctr_margin, edge_time, delay, distortion,"
        ' power, timing_guard, isolation (did you mean "edge_time"?)',
    ),
    "a section": (
        "set = { signals = { lit = 0.5 } }",
        "line 6, link.1.set.signals: found an unknown section; expected one of title, signal, drive, output, environment,"
        ' limits, stock, couplers, goal (did you mean "signal"?)',
    ),
    "no section": ("set.stock = 3", "line 6, link.1.set.stock: found 3; expected a section, [stock]"),
    "no table": ("set = 3", "line 6, link.1.set: found 3; expected keys of the brief, such as set.signal.lit = 0.3"),
    "a path": (
        'set.couplers.table = "none.csv"',
        'line 6, link.1.set.couplers.table: found "none.csv", where there is no file; '
        "expected a file, its path relative to the board file's folder",
    ),
    "not together with the brief": (
        'set.signal.rate = "1 kbit/s"',
        "line 6, link.1.set: found rate and shortest_pulse at signal.shortest_pulse; "
        "expected one of the two; 1 / rate is the shortest pulse",
    ),
    "something lacks": (
        'unset = ["output.supply"]',
        'line 6, link.1.unset: found nothing at output.supply; expected supply, such as ["3.135 V", "3.465 V"]',
    ),
    "nothing to leave out": (
        'unset = ["limits.edge_tim"]',
        'line 6, link.1.unset: found "limits.edge_tim"; expected keys that the brief gives'
        ' (did you mean "limits.edge_time"?)',
    ),
    "no list": (
        'unset = "limits.delay"',
        'line 6, link.1.unset: found "limits.delay"; expected a list of texts such as ["limits.delay"]',
    ),
}


@pytest.mark.parametrize("name", WRONG_CHANGES)
def test_one_wrong_change(folder, name):
    change, message = WRONG_CHANGES[name]
    text = f'[goal]\nminimize = "power"\n[[link]]\nname = "one"\nbrief = "tiny.toml"\n{change}\n'
    assert mistakes_of(written(folder, text=text)) == [f"board.toml {message}"]


def test_mistakes_of_a_shelf_that_a_link_names(folder):
    (folder / "shelf.csv").write_text("value\nten\n", encoding="utf-8")
    text = '[goal]\nminimize = "power"\n[[link]]\nname = "one"\nbrief = "tiny.toml"\n'
    found = mistakes_of(written(folder, text=text + 'set.stock.r_load.values = "shelf.csv"\n'))
    assert len(found) == 1
    assert found[0].startswith("shelf.csv line 2")


def test_a_wrong_brief_is_told_once_for_all_its_links(folder):
    brief = (folder / "tiny.toml").read_text(encoding="utf-8")
    (folder / "tiny.toml").write_text(brief.replace("lit = 0.5", "lit = 7"), encoding="utf-8")
    assert len(mistakes_of(written(folder, text=CHANGED))) == 1
