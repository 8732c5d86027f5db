"""The documents say what the program does: commands run, outputs are its own, links lead somewhere."""

from __future__ import annotations

import re
import subprocess

import click
import pytest
from cli_links import CHECK, FIELDS, RESULT
from command import ROOT, commands_of
from documents import DOCUMENTS, KEYS, keys_table, printed_by, shown_in, steady

from optopick.cli import main

README = (ROOT / "README.md").read_text(encoding="utf-8")
CODE = re.compile(r"```(\w*)\n(.*?)```", re.DOTALL)
SHOWN = [(path.name, shown) for path in DOCUMENTS for shown in shown_in(path)]


@pytest.mark.parametrize(("name", "shown"), SHOWN, ids=lambda part: getattr(part, "command", None))
def test_output_is_what_the_program_prints(name, shown):
    """Where this is meant to change: `python -m tests.renew_documents`."""
    assert steady(printed_by(shown.command)) == steady(shown.output), f"{name}; python -m tests.renew_documents"


def test_the_readme_shows_the_program():
    commands = {shown.command.split()[1] for name, shown in SHOWN if name == "README.md"}
    assert {"pick", "check", "rank", "tradeoff", "why"} <= commands


def test_every_command_and_option_is_documented():
    for name, command in commands_of(main):
        assert f"optopick {name} " in README or f"`{name}`" in README, name
        for parameter in command.params:
            if isinstance(parameter, click.Option) and "--help" not in parameter.opts:
                assert any(re.search(rf"{opt}(?![\w-])", README) for opt in parameter.opts), (name, parameter.opts)


def test_json_fields_and_exit_codes_are_documented():
    for field in RESULT | CHECK | {name for names in FIELDS.values() for name in names}:
        assert f"`{field}`" in README, field
    for code in range(5):
        assert re.search(rf"^\| {code} \| \S", README, re.MULTILINE), code


def test_it_opens_with_the_job_and_two_commands():
    """A title, one paragraph, and the two commands before anything else; CI runs the second word for word."""
    title, paragraph = README.split("\n\n")[:2]
    assert title == "# optopick"
    assert len(paragraph) > 200
    blocks = [body.strip() for _, body in CODE.findall(README)]
    assert blocks[0].endswith(".venv/bin/optopick pick examples/fastest.toml")
    assert "pytest" in blocks[1]
    for command in blocks[:2]:
        assert command.startswith("python3 -m venv .venv && .venv/bin/pip install")
        assert "\n" not in command
    assert blocks[1] in (ROOT / ".ci" / "run").read_text(encoding="utf-8").splitlines()
    assert README.index(blocks[1]) < README.index("\n## ")


def test_python_in_the_readme_runs(monkeypatch, capsys):
    monkeypatch.chdir(ROOT)
    blocks = [body for language, body in CODE.findall(README) if language == "python"]
    assert blocks
    for body in blocks:
        exec(compile(body, "README.md", "exec"), {})
    assert capsys.readouterr().out


def test_the_table_of_keys_is_current():
    text = (ROOT / "examples" / "README.md").read_text(encoding="utf-8")
    found = KEYS.search(text)
    assert found
    assert found.group() == f"<!-- keys -->\n{keys_table()}<!-- end of keys -->", "python -m tests.renew_documents"


def test_links_lead_somewhere():
    tracked = [ROOT / name for name in ("README.md", "DEVELOPERS.md", "CHANGELOG.md", "examples/README.md")]
    tracked += [ROOT / "catalogs" / "README.md", ROOT / "tests" / "benchmarks" / "README.md"]
    for path in tracked:
        for target in re.findall(r"\]\(([^)#]+)(?:#[^)]*)?\)", path.read_text(encoding="utf-8")):
            assert "://" in target or (path.parent / target).exists(), (path.name, target)


def test_paths_in_the_guide_exist():
    """What DEVELOPERS.md calls by a path under a folder of the repository is there."""
    text = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")
    folders = "optopick|tests|examples|catalogs|.ci"
    found = re.findall(rf"`((?:{folders})/[\w./-]*)`", text)
    assert len(found) > 10
    for target in found:
        assert (ROOT / target).exists(), target


def test_the_ci_script_is_sound():
    """Bash reads it, it may be executed, and it stops at the first failure, in a pipe too."""
    path = ROOT / ".ci" / "run"
    assert path.stat().st_mode & 0o111
    assert subprocess.run(["bash", "-n", path], check=False).returncode == 0
    text = path.read_text(encoding="utf-8")
    assert "set -euo pipefail" in text
    for tool in ("ruff check .", "ruff format --check .", "mypy"):
        assert re.search(rf"^\.venv/bin/{tool}$", text, re.MULTILINE), tool
