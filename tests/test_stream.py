"""Tables ranked row by row: what `rank` gives, killed and gone on with, nothing solved twice; what files are refused."""

from __future__ import annotations

import json
import os
import signal
import subprocess
import sys
from collections import Counter
from dataclasses import replace
from pathlib import Path

import pytest
from cli_links import TINY, impossible, json_of
from command import ROOT, run
from coupler_tables import DARLINGTON, LOGIC, PHOTOTRANSISTOR, write_table
from many_rows import link
from test_coupler_files import rows_of, saved

from optopick.coupler import Coupler
from optopick.coupler_stream import MOST, CouplerStream
from optopick.errors import InputError
from optopick.read_brief import read_brief
from optopick.read_couplers import read_couplers
from optopick.uses import rank_stream
from optopick.uses.rank import rank, rank_one
from optopick.uses.rank_stream import rank_streamed
from optopick.uses.workers import Here, Processes

DEMO = ROOT / "catalogs" / "demo.csv"
COUNT = 36


@pytest.fixture(scope="module")
def many(tmp_path_factory) -> Path:
    """A brief and its generated table."""
    return link(tmp_path_factory.mktemp("many"), COUNT)


@pytest.fixture(scope="module")
def ranked(many):
    return rank(read_brief(many), workers=Here())


def lines_of(results: Path) -> list[dict]:
    """Outcomes of a file, without its first line."""
    return [json.loads(line) for line in results.read_text(encoding="utf-8").splitlines()[1:]]


class Counted:
    """`rank_one`, with the parts it was asked for; an interrupt at one of the calls."""

    def __init__(self, monkeypatch: pytest.MonkeyPatch, interrupt_at: int = 0) -> None:
        self.parts: list[str] = []
        self.interrupt_at = interrupt_at
        monkeypatch.setattr(rank_stream, "rank_one", self)

    def __call__(self, task):
        if len(self.parts) + 1 == self.interrupt_at:
            raise KeyboardInterrupt
        self.parts.append(task.coupler.part)
        return rank_one(task)


# --- the table -------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("kind", ["csv", "xlsx", "parquet"])
def test_rows_are_those_of_the_whole_table(tmp_path, kind):
    sheet = PHOTOTRANSISTOR | {"h_fe_typ": "400"}
    rows = (
        sheet | {"bin": "A", "ctr_min": "40", "ctr_max": "80"},
        DARLINGTON,
        sheet | {"bin": "C", "ctr_min": "160", "ctr_max": "320"},
        LOGIC | {"i_f_on": ""},
        sheet | {"bin": "B", "ctr_min": "80", "ctr_max": "160", "c_cb": ""},
        LOGIC | {"part": "VELM8"},
    )
    path = write_table(tmp_path, *rows) if kind == "csv" else saved(tmp_path, rows_of(*rows), kind)
    table, stream = read_couplers(path), CouplerStream(path)
    for _ in range(2):
        found = [row.resolved for row in stream.rows()]
        assert tuple(one for one in found if isinstance(one, Coupler)) == table.couplers
        assert tuple(one for one in found if not isinstance(one, Coupler)) == table.set_aside
    assert stream.count == len(rows)
    assert table.set_aside


def test_rows_of_the_demo_table():
    table, found = read_couplers(DEMO), [row.resolved for row in CouplerStream(DEMO).rows()]
    assert tuple(one for one in found if isinstance(one, Coupler)) == table.couplers


def test_few_mistakes_are_those_of_the_whole_table(tmp_path):
    path = write_table(
        tmp_path,
        PHOTOTRANSISTOR | {"v_r_max": "900", "part": "A1"},
        PHOTOTRANSISTOR | {"part": "B1", "colour": "red"},
        PHOTOTRANSISTOR | {"part": "a1", "i_f_max": "red"},
    )
    with pytest.raises(InputError) as whole:
        read_couplers(path)
    with pytest.raises(InputError) as streamed:
        CouplerStream(path)
    assert len(whole.value.mistakes) == 4
    assert streamed.value.mistakes == whole.value.mistakes


def test_of_many_mistakes_the_first_are_told_and_the_others_counted(tmp_path):
    path = write_table(tmp_path, *(PHOTOTRANSISTOR | {"part": f"P{k}", "v_r_max": "900"} for k in range(MOST + 13)))
    with pytest.raises(InputError) as whole:
        read_couplers(path)
    with pytest.raises(InputError) as streamed:
        CouplerStream(path)
    assert streamed.value.mistakes[:MOST] == whole.value.mistakes[:MOST]
    assert [str(one) for one in streamed.value.mistakes[MOST:]] == ["table.csv: found 13 mistakes more; expected none"]


def test_a_table_that_changes_meanwhile(tmp_path):
    path = write_table(tmp_path, PHOTOTRANSISTOR, LOGIC)
    stream = CouplerStream(path)
    write_table(tmp_path, PHOTOTRANSISTOR | {"ctr_at": "7"}, LOGIC)
    with pytest.raises(InputError, match="another table than before"):
        list(stream.rows())


def test_a_key_is_that_of_the_figures(tmp_path):
    def keys(*rows: dict[str, str]) -> list[str]:
        return [row.key for row in CouplerStream(write_table(tmp_path, *rows)).rows()]

    one, other = PHOTOTRANSISTOR | {"bin": "A"}, PHOTOTRANSISTOR | {"bin": "B", "ctr_max": "400"}
    alone, together = keys(one), keys(LOGIC, one, other)
    assert keys(LOGIC, one)[1:] == alone
    assert keys(one | {"c_cb": "7"}) != alone
    # the other bin moves the middle of the part, and with it the gain
    assert together[1] != alone[0]
    assert keys(other, one, LOGIC) == [together[2], together[1], together[0]]


# --- the ranking -----------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("workers", [Here(), Processes(2)])
def test_the_best_are_those_of_the_whole_ranking(tmp_path, many, ranked, workers):
    streamed = rank_streamed(read_brief(many), tmp_path / "out.jsonl", top=7, workers=workers)
    assert repr(streamed.ranking.ranked) == repr(ranked.ranked[:7])
    assert streamed.ranking.complete
    assert (streamed.rows, streamed.designed) == (COUNT, len(ranked.ranked))
    assert sum(count for _, count in streamed.rejected) == len(ranked.rejected)
    assert (streamed.before, streamed.now, streamed.passed_over) == (0, COUNT, 0)
    reasons = {line["part"]: line["reason"] for line in lines_of(tmp_path / "out.jsonl") if "reason" in line}
    assert reasons == {one.part: one.reason for one in ranked.rejected}
    assert len(ranked.ranked) > 7
    assert len(ranked.rejected) > 3


def test_what_is_finished_is_not_solved_again(tmp_path, monkeypatch, many, ranked):
    brief, results = read_brief(many), tmp_path / "out.jsonl"
    first = Counted(monkeypatch, interrupt_at=11)
    streamed = rank_streamed(brief, results, top=7, workers=Here())
    assert not streamed.ranking.complete
    assert len(first.parts) == 10
    second = Counted(monkeypatch)
    streamed = rank_streamed(brief, results, top=7, workers=Here())
    assert repr(streamed.ranking.ranked) == repr(ranked.ranked[:7])
    assert streamed.before + streamed.now == COUNT
    assert not set(first.parts) & set(second.parts)
    usable = {coupler.part for coupler in read_couplers(brief.couplers.table).couplers}
    assert Counter(first.parts + second.parts) == Counter(usable)
    third = Counted(monkeypatch)
    again = rank_streamed(brief, results, top=7, workers=Here())
    assert third.parts == []
    assert again == replace(streamed, before=COUNT, now=0)


KILLED = """
import os, signal, sys
from optopick.cli import main
from optopick.uses.results_file import ResultsFile
write, done = ResultsFile._write, []
def torn(self, line, key):
    if len(done) == 12:
        self._file.seek(0, os.SEEK_END)
        self._file.write(b'{"key": "half a li')
        self._file.flush()
        os.kill(os.getpid(), signal.SIGKILL)
    done.append(key)
    write(self, line, key)
ResultsFile._write = torn
main()
"""


def test_killed_in_the_middle_of_a_line_it_goes_on_from_there(tmp_path, many):
    """By processes: those of the run that was killed hold nothing that the next one needs."""
    results, whole = tmp_path / "out.jsonl", tmp_path / "whole.jsonl"
    arguments = ("rank", many, "--top", "7", "--json", "--workers", "2")
    killed = subprocess.run(
        [sys.executable, "-c", KILLED, *map(str, arguments), "--results", str(results)],
        cwd=ROOT,
        env={**os.environ, "PYTHONPATH": str(ROOT)},
        stdin=subprocess.DEVNULL,
        capture_output=True,
        check=False,
    )
    assert killed.returncode == -signal.SIGKILL
    torn = results.read_text(encoding="utf-8")
    assert torn.endswith('{"key": "half a li')
    assert len(torn.splitlines()) == 13
    ran, once = (json_of(run("-q", *arguments, "--results", path)) for path in (results, whole))
    assert (ran.pop("before"), ran.pop("now")) == (11, COUNT - 11)
    assert (once.pop("before"), once.pop("now")) == (0, COUNT)
    assert ran == once
    keys = Counter(line["key"] for line in lines_of(results))
    assert len(keys) == COUNT
    assert set(keys.values()) == {1}
    assert sorted(lines_of(results), key=str) == sorted(lines_of(whole), key=str)


def test_only_changed_rows_are_solved_again(tmp_path, monkeypatch, many):
    brief, results, table = read_brief(many), tmp_path / "out.jsonl", tmp_path / "other.csv"
    rank_streamed(brief, results, workers=Here())
    header, *lines = brief.couplers.table.read_text(encoding="utf-8").splitlines()
    part = next(coupler.part for coupler in read_couplers(brief.couplers.table).couplers[6:])
    at = next(k for k, line in enumerate(lines) if line.startswith(",".join(part.rsplit("-", 1)) + ","))
    lines[at] = lines[at].replace(",yes,1,", ",yes,2,")
    table.write_text("\n".join([header, "# moved", *lines[1:], ""]), encoding="utf-8")
    moved = replace(brief, title="Moved", couplers=replace(brief.couplers, table=table))
    counted = Counted(monkeypatch)
    streamed = rank_streamed(moved, results, top=50, workers=Here())
    assert part in counted.parts
    # besides it only the bins beside the one that has left the table
    assert len(counted.parts) <= 3
    assert repr(streamed.ranking.ranked) == repr(rank(moved, workers=Here()).ranked)
    assert streamed.rows == COUNT - 1


# --- passing over ----------------------------------------------------------------------------------------------------


def test_couplers_passed_over_are_not_among_the_best(tmp_path, monkeypatch, many, ranked):
    brief, results = read_brief(many), tmp_path / "out.jsonl"
    counted = Counted(monkeypatch)
    streamed = rank_streamed(brief, results, top=3, top_only=True, workers=Here())
    assert repr(streamed.ranking.ranked) == repr(ranked.ranked[:3])
    assert streamed.passed_over > 5
    assert streamed.passed_over + streamed.designed + sum(n for _, n in streamed.rejected) == COUNT
    places = [one.coupler.part for one in ranked.ranked]
    over = {line["part"] for line in lines_of(results) if line["outcome"] == "passed over"}
    assert not over & set(places[:3])
    assert not over & set(counted.parts)
    # the same again, more of the best, and at last all
    for top in (3, 6):
        again = rank_streamed(brief, results, top=top, top_only=True, workers=Here())
        assert repr(again.ranking.ranked) == repr(ranked.ranked[:top])
        assert again.before + again.now == COUNT
    every = rank_streamed(brief, results, top=6, workers=Here())
    assert every.passed_over == 0
    assert every.designed == len(ranked.ranked)
    assert len(counted.parts) == len(set(counted.parts))


def test_passed_over_for_couplers_that_have_left_the_table(tmp_path, many, ranked):
    brief, results = read_brief(many), tmp_path / "out.jsonl"
    assert rank_streamed(brief, results, top=3, top_only=True, workers=Here()).passed_over
    best = {one.coupler.part.rsplit("-", 1)[0] for one in ranked.ranked[:3]}
    lines = brief.couplers.table.read_text(encoding="utf-8").splitlines(keepends=True)
    table = tmp_path / "without.csv"
    table.write_text("".join(line for line in lines if line.split(",")[0] not in best), encoding="utf-8")
    without = replace(brief, couplers=replace(brief.couplers, table=table))
    streamed = rank_streamed(without, results, top=3, top_only=True, workers=Here())
    assert repr(streamed.ranking.ranked) == repr(rank(without, workers=Here()).ranked[:3])
    assert streamed.before + streamed.now == streamed.rows < COUNT


# --- files that are refused ------------------------------------------------------------------------------------------


def refused(brief, results: Path, **options) -> str:
    before = results.read_bytes()
    with pytest.raises(InputError) as refusal:
        rank_streamed(brief, results, workers=Here(), **options)
    assert results.read_bytes() == before
    assert len(refusal.value.mistakes) == 1
    return str(refusal.value)


@pytest.fixture
def begun(tmp_path):
    """The tiny brief and its file of results."""
    brief, results = read_brief(TINY), tmp_path / "out.jsonl"
    rank_streamed(brief, results, workers=Here())
    return brief, results


def test_results_of_another_brief(begun):
    brief, results = begun
    warmer = replace(brief, environment=replace(brief.environment, life=1.0))
    assert "begun with another brief or time limit" in refused(warmer, results)
    assert "begun with another brief or time limit" in refused(brief, results, time_limit=60.0)
    assert rank_streamed(replace(brief, title="Another title"), results, workers=Here()).now == 0


def test_results_of_another_version(begun):
    brief, results = begun
    text = results.read_text(encoding="utf-8")
    results.write_text(text.replace('"optopick": "', '"optopick": "9.', 1), encoding="utf-8")
    assert "begun with another version of optopick (9." in refused(brief, results)


def test_no_results_at_all(begun, tmp_path):
    brief, _ = begun
    for text in ("hello", "hello\n", "part,kind\nA,logic\n", '{"a": 1}\n', "[1]\n"):
        path = tmp_path / "other"
        path.write_text(text, encoding="utf-8")
        assert "no file of results" in refused(brief, path)
    for path in (tmp_path, tmp_path / "no" / "folder.jsonl"):
        ran = run("rank", TINY, "--results", path)
        assert (ran.code, ran.out) == (2, "")
        assert "--results" in ran.err


def test_a_file_begun_and_killed_at_once(begun):
    brief, results = begun
    header = results.read_bytes().splitlines(keepends=True)[0]
    for kept in (b"", header[:1], header[:-1], header):
        results.write_bytes(kept)
        assert rank_streamed(brief, results, workers=Here()).now == 2


def test_damaged_lines(begun):
    brief, results = begun
    header, first, second = results.read_text(encoding="utf-8").splitlines(keepends=True)
    for damaged in ("{}\n", "\n", first.replace('"key"', '"kez"'), first[: len(first) // 2] + "\n"):
        results.write_text(header + damaged + second, encoding="utf-8")
        assert "out.jsonl line 2: found no outcome of a coupler" in refused(brief, results)


def test_a_design_that_does_not_hold(begun):
    brief, results = begun
    text = results.read_text(encoding="utf-8")
    for old, new in (('"r_load": ', '"r_load": 1'), ('"value": 0.0', '"value": 0.00')):
        assert old in text
        results.write_text(text.replace(old, new, 1), encoding="utf-8")
        assert "does not hold when it is checked again" in refused(brief, results)


def test_two_runs_at_once(begun):
    brief, results = begun
    script = (
        "import fcntl, sys, time\n"
        "file = open(sys.argv[1], 'r+b')\n"
        "fcntl.lockf(file, fcntl.LOCK_EX)\n"
        "print('locked', flush=True)\n"
        "time.sleep(600)\n"
    )
    with subprocess.Popen([sys.executable, "-c", script, results], stdout=subprocess.PIPE) as other:
        assert other.stdout.readline() == b"locked\n"
        assert "which another run is writing" in refused(brief, results)
        other.kill()
    assert rank_streamed(brief, results, workers=Here()).now == 0


# --- the command -----------------------------------------------------------------------------------------------------


def test_the_command(tmp_path, many):
    results = tmp_path / "out.jsonl"
    arguments = ("-q", "rank", many, "--results", results, "--workers", "1")
    shown = run(*arguments)
    assert shown.code == 0
    assert f"of {COUNT} couplers, by least power, then least edge time" in shown.out
    assert f"{COUNT} settled now, 0 before; each with its outcome in out.jsonl" in shown.out
    assert "i_f_max: empty, and no rule fills it" in shown.out
    found = json_of(run(*arguments, "--top", "4", "--json"))
    plain = json_of(run("-q", "rank", many, "--json", "--workers", "1"))
    assert found["ranked"] == plain["ranked"][:4]
    assert (found["rows"], found["designed"], found["before"]) == (COUNT, len(plain["ranked"]), COUNT)
    assert sum(one["count"] for one in found["rejected_for"]) == len(plain["rejected"])
    assert run(*arguments, "--top", "4", "--csv").out == run("-q", "rank", many, "--top", "4", "--csv").out
    over = run("-q", "rank", many, "--results", tmp_path / "over.jsonl", "--top", "2", "--top-only", "--workers", "1")
    assert "were passed over: ranges show that none of them has a design as good as the last of the best 2" in over.out


def test_no_design_and_wrong_options(tmp_path):
    ran = run("rank", impossible(tmp_path), "--results", tmp_path / "out.jsonl")
    assert ran.code == 3
    assert "None of the 2 couplers has a design" in ran.out
    ran = run("rank", TINY, "--top-only")
    assert ran.code == 2
    assert "--top-only: found no --results" in ran.err
