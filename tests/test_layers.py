"""Imports go one way, and what only one place may do is done only there."""

from __future__ import annotations

import ast
import json
import re
import subprocess
import sys
import tomllib
from collections.abc import Iterator
from graphlib import TopologicalSorter
from itertools import pairwise
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[1]
PACKAGE = ROOT / "optopick"

# Lowest first. A module may import what stands on a lower line, and its own package; `of_package` finds its line.
LAYERS: tuple[tuple[str, ...], ...] = (
    ("errors", "units", "eseries", "toml_lines", "toml_text"),
    ("brief", "coupler", "board"),
    ("physics",),
    (
        *("keys", "stock", "key_values", "read_keys", "brief_rules", "brief_stock", "read_brief", "brief_schema"),
        *("coupler_columns", "coupler_curves", "coupler_files", "coupler_cells", "gaps", "gaps_switching"),
        *("coupler_rows", "coupler_sheets", "coupler_stream", "read_couplers", "switching_rows", "switching_fit"),
        *(
            "board_keys",
            "board_changes",
            "read_board",
            "corners",
            "result",
            "answers",
            "board_answers",
            "stream_answers",
            "cautions",
        ),
    ),
    ("model", "recheck", "simulate"),
    ("report",),
    ("uses",),
    ("cli",),
)

# Names of one line that know nothing of each other: the re-check must not lean on the model it checks.
STRANGERS = ({"model", "recheck"}, {"model", "simulate"}, {"brief", "coupler"})

SOLVERS = {"pyomo", "highspy"}
SLOW = {"numpy", "scipy", "pandas", "pyomo", "highspy", "rich", "quantiphy", "rkm_codes", "distributed"}


def module_name(path: Path) -> str:
    parts = path.relative_to(ROOT).with_suffix("").parts
    return ".".join(parts[:-1] if parts[-1] == "__init__" else parts)


MODULES = {module_name(path): path for path in sorted(PACKAGE.rglob("*.py"))}
TREES = {name: ast.parse(path.read_text(encoding="utf-8")) for name, path in MODULES.items()}
FACADE = "optopick"  # loads its names on first use, from any layer


def imported(tree: ast.AST) -> Iterator[str]:
    """Every module an `import` anywhere in the tree names, inside functions and type checks too."""
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            yield from (alias.name for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, "relative imports hide where they lead"
            assert node.module is not None
            for alias in node.names:
                inner = f"{node.module}.{alias.name}"
                yield inner if inner in MODULES else node.module
        elif isinstance(node, ast.Call) and ast.unparse(node.func).endswith("import_module"):
            yield from (argument.value for argument in node.args if isinstance(argument, ast.Constant))


def of_package(module: str) -> str:
    """The first part of a module's name below `optopick`."""
    return module.split(".")[1] if "." in module else ""


def layer(module: str) -> int:
    for k, names in enumerate(LAYERS):
        if of_package(module) in names:
            return k
    raise AssertionError(f"{module} has no place in LAYERS of {Path(__file__).name}: give it one")


def inner_imports(module: str) -> set[str]:
    return {name for name in imported(TREES[module]) if name.split(".")[0] == "optopick"} - {module}


INSIDE = [name for name in MODULES if name != FACADE]


@pytest.mark.parametrize("module", INSIDE)
def test_imports_go_down(module):
    for other in inner_imports(module):
        assert other != FACADE, f"{module} imports the package's front"
        same_package = of_package(other) == of_package(module)
        assert layer(other) <= layer(module), f"{module} must not import {other}, which stands above it"
        if layer(other) == layer(module) and not same_package:
            pair = {of_package(module), of_package(other)}
            assert pair not in STRANGERS, f"{module} must not know {other}"


def test_no_import_circles():
    """A package counts as its `__init__`; a module that imports a sibling through it is not a circle."""
    graph = {module: inner_imports(module) for module in INSIDE}
    for module, others in graph.items():
        graph[module] = {other for other in others if not module.startswith(other + ".")}
    assert len(list(TopologicalSorter(graph).static_order())) >= len(INSIDE)


def test_every_name_in_the_table_exists():
    placed = [name for names in LAYERS for name in names]
    assert len(placed) == len(set(placed))
    assert set(placed) == {of_package(module) for module in INSIDE}


def test_layers_see_the_circle_and_the_climb():
    """The detectors themselves: an import inside a function counts, a submodule counts as itself."""
    tree = ast.parse("def f():\n    from optopick.recheck import review\n    import optopick.cli\n")
    assert list(imported(tree)) == ["optopick.recheck.review", "optopick.cli"]
    assert all(layer(f"optopick.{low[0]}") < layer(f"optopick.{high[0]}") for low, high in pairwise(LAYERS))


def top_names(module: str) -> set[str]:
    return {name.split(".")[0] for name in imported(TREES[module])}


def test_one_module_knows_the_solver():
    assert {module for module in MODULES if top_names(module) & SOLVERS} == {"optopick.model.solver"}


def test_physics_knows_arrays_and_couplers_only():
    known = {"__future__", "collections", "dataclasses", "math", "numpy", "scipy", "optopick", "typing"}
    for module in MODULES:
        if of_package(module) == "physics":
            assert top_names(module) <= known, module
            assert {of_package(other) for other in inner_imports(module)} <= {"physics", "coupler"}, module


def test_only_the_command_line_knows_the_command_line():
    assert {of_package(module) for module in MODULES if "click" in top_names(module)} == {"cli"}


def prints(tree: ast.AST) -> Iterator[str]:
    """What writes to the terminal: print, a console, a standard stream."""
    for node in ast.walk(tree):
        if isinstance(node, ast.Name) and node.id in ("print", "Console"):
            yield node.id
        if isinstance(node, ast.Attribute) and node.attr in ("stdout", "stderr"):
            yield node.attr


def test_only_the_command_line_prints():
    loud = {of_package(module): list(prints(TREES[module])) for module in MODULES if of_package(module) != "cli"}
    assert {name: found for name, found in loud.items() if found} == {}
    assert any(list(prints(TREES[module])) for module in MODULES if of_package(module) == "cli")


def loaded_after(code: str) -> set[str]:
    """Top-level names of the modules that a fresh interpreter holds once it has run `code`."""
    script = f"import json, sys\n{code}\nsys.stderr.write(json.dumps(sorted(sys.modules)))"
    run = subprocess.run(
        [sys.executable, "-c", script], capture_output=True, text=True, cwd=ROOT, stdin=subprocess.DEVNULL, check=False
    )
    assert run.returncode == 0, run.stderr
    return {name.split(".")[0] for name in json.loads(run.stderr.splitlines()[-1])}


def test_import_is_light():
    assert not loaded_after("import optopick.cli") & SLOW
    assert "click" in loaded_after("import optopick.cli")


def test_help_is_light():
    """Help of the program and of each command, without anything that takes its time to load."""
    code = """
import optopick.cli as cli
for command in [[], *([name] for name in cli.main.commands)]:
    try:
        cli.main([*command, "--help"])
    except SystemExit as end:
        assert end.code == 0
"""
    assert not loaded_after(code) & SLOW


def test_wrong_input_does_not_wait_for_the_solver():
    code = """
import optopick.cli as cli
try:
    cli.main(["pick", "there-is-no-such-brief.toml"])
except SystemExit as end:
    assert end.code == 2
"""
    found = loaded_after(code)
    assert not found & SOLVERS


def test_python_front_is_light_and_complete():
    assert not loaded_after("import optopick") & SLOW
    code = "import optopick\nfor name in optopick.__all__: assert callable(getattr(optopick, name)), name"
    loaded = loaded_after(code)
    assert not loaded & SOLVERS


def test_what_is_imported_is_declared():
    """Every package that the program imports stands among its dependencies, and none stands there for nothing."""
    project = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["project"]
    declared = {re.split(r"[<>=!~ \[]", line)[0].replace("-", "_").lower() for line in project["dependencies"]}
    used = {name for module in MODULES for name in top_names(module)} - set(sys.stdlib_module_names) - {"optopick"}
    by_name_only = {"highspy"}  # Pyomo loads it by itself
    extra = {"distributed": "cluster", "pyarrow": "parquet"}
    assert (used - set(extra)) | by_name_only == declared
    for name, of in extra.items():
        assert name in used
        assert any(line.startswith(name) for line in project["optional-dependencies"][of])


def test_files_beside_the_code_are_packaged():
    """What the program reads from its own folder goes into the package that pip installs."""
    tools = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["tool"]
    patterns = tools["setuptools"]["package-data"]["optopick"]
    packaged = {path for pattern in patterns for path in PACKAGE.glob(pattern) if path.is_file()}
    ours = {path for path in PACKAGE.rglob("*") if path.is_file() and "__pycache__" not in path.parts}
    assert {str(path.relative_to(PACKAGE)) for path in ours - packaged if path.suffix != ".py"} == set()
