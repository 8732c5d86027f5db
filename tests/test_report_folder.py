"""A folder of reports is there in full or not at all, and nothing that is not a report's is ever removed."""

from __future__ import annotations

from pathlib import Path

import pytest

from optopick.errors import InputError
from optopick.report.folder import REPORT_FILES, refuse_occupied, write_folder

FILES = {"report.html": "<p>Ω</p>", "bom.csv": b"a,b\n"}


def contents(folder: Path) -> dict[str, bytes]:
    return {path.name: path.read_bytes() for path in folder.iterdir()}


def refusal(target: Path, force: bool = False) -> str:
    before = sorted(target.parent.iterdir()) if target.parent.exists() else []
    with pytest.raises(InputError) as caught:
        write_folder(target, FILES, force)
    assert (sorted(target.parent.iterdir()) if target.parent.exists() else []) == before
    (mistake,) = caught.value.mistakes
    assert mistake.where == str(target)
    return f"{mistake.found}; {mistake.expected}"


def test_new_folder(tmp_path):
    """Parents are made, text is UTF-8, and nothing else is left beside it."""
    target = tmp_path / "deep" / "down" / "review"
    write_folder(target, FILES, force=False)
    assert contents(target) == {"report.html": "<p>Ω</p>".encode(), "bom.csv": b"a,b\n"}
    assert [path.name for path in target.parent.iterdir()] == ["review"]


def test_mode_is_that_of_any_folder(tmp_path):
    (tmp_path / "usual").mkdir()
    write_folder(tmp_path / "review", FILES, force=False)
    assert (tmp_path / "review").stat().st_mode == (tmp_path / "usual").stat().st_mode


def test_existing_folder_is_refused(tmp_path):
    target = tmp_path / "review"
    write_folder(target, FILES, force=False)
    (target / "report.html").write_text("changed")
    assert refusal(target) == "a folder that is there already; a new folder, or --force"
    assert (target / "report.html").read_text() == "changed"


def test_refusal_before_any_work(tmp_path):
    """What is there already is refused before the solving, unless it may be replaced."""
    refuse_occupied(tmp_path / "new", force=False)
    refuse_occupied(tmp_path, force=True)
    with pytest.raises(InputError, match="something that is there already"):
        refuse_occupied(tmp_path, force=False)


def test_force_replaces_an_earlier_report(tmp_path):
    target = tmp_path / "review"
    write_folder(target, {**FILES, "report.html": "old"}, force=False)
    write_folder(target, FILES, force=True)
    assert contents(target) == {"report.html": "<p>Ω</p>".encode(), "bom.csv": b"a,b\n"}
    assert [path.name for path in tmp_path.iterdir()] == ["review"]


def test_force_never_removes_what_is_not_a_report_s(tmp_path):
    target = tmp_path / "review"
    write_folder(target, FILES, force=False)
    (target / "notes.txt").write_text("mine")
    assert refusal(target, force=True) == '"notes.txt"; a folder with nothing in it but an earlier report'
    (target / "more.txt").write_text("mine")
    assert refusal(target, force=True).startswith('"more.txt" and 1 more')
    assert (target / "notes.txt").read_text() == "mine"


def test_force_replaces_a_report_that_had_more_files(tmp_path):
    """A brief that has become infeasible writes fewer files; nothing of the earlier answer stays."""
    target = tmp_path / "review"
    write_folder(target, dict.fromkeys(REPORT_FILES, "old"), force=False)
    write_folder(target, {"review.html": "new"}, force=True)
    assert contents(target) == {"review.html": b"new"}


def test_a_folder_by_a_report_s_name_is_not_a_report(tmp_path):
    (tmp_path / "review" / "bom.csv").mkdir(parents=True)
    assert refusal(tmp_path / "review", force=True).startswith('"bom.csv"')


@pytest.mark.parametrize("force", [False, True])
def test_a_file_or_a_link_is_refused(tmp_path, force):
    (tmp_path / "file").write_text("mine")
    assert refusal(tmp_path / "file", force) == "something that is no folder; a new folder"
    (tmp_path / "real").mkdir()
    (tmp_path / "link").symlink_to(tmp_path / "real")
    assert refusal(tmp_path / "link", force) == "something that is no folder; a new folder"
    (tmp_path / "nowhere").symlink_to(tmp_path / "missing")
    assert refusal(tmp_path / "nowhere", force) == "something that is no folder; a new folder"


def test_a_path_below_a_file(tmp_path):
    (tmp_path / "file").write_text("mine")
    with pytest.raises(InputError) as caught:
        write_folder(tmp_path / "file" / "review", FILES, force=False)
    assert "a place that can be written" in str(caught.value)


def test_a_failure_while_writing_leaves_nothing(tmp_path, monkeypatch):
    def full(self, data):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(Path, "write_bytes", full)
    assert refusal(tmp_path / "review") == "No space left on device; a place that can be written"


def test_a_failure_while_swapping_brings_the_old_report_back(tmp_path, monkeypatch):
    target = tmp_path / "review"
    write_folder(target, {**FILES, "report.html": "old"}, force=False)
    rename = Path.rename

    def fails(self, to):
        if self.name.endswith(".part"):
            raise OSError(5, "Input/output error")
        return rename(self, to)

    monkeypatch.setattr(Path, "rename", fails)
    assert refusal(target, force=True) == "Input/output error; a place that can be written"
    assert (target / "report.html").read_text() == "old"


def test_a_name_that_leads_elsewhere(tmp_path):
    for name in ("../out", "a/b", "", ".hidden", ".."):
        with pytest.raises(ValueError, match="plain file name"):
            write_folder(tmp_path / "review", {name: "x"}, force=False)
    assert list(tmp_path.iterdir()) == []


def test_a_relative_path(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    write_folder(Path("review"), FILES, force=False)
    assert [path.name for path in tmp_path.iterdir()] == ["review"]
