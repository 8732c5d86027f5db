"""Board files: what is read from a right one, and exact messages for wrong ones, all at once."""

from __future__ import annotations

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


GOALS = 'one of "power", "reels", "couplers"'

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
        "board.toml line 5, limits.coupler: found an unknown key; expected one of reels, couplers, power"
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
        'board.toml line 16, link.1.number: found an unknown key; expected one of name, brief, count (did you mean "name"?)',
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
