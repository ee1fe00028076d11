"""Imports form a ladder: who may import whom, read from the source."""

from __future__ import annotations

import ast
from pathlib import Path

import pytest

import ozsolve

ROOT = Path(__file__).resolve().parents[1]
LADDER = [
    "errors", "potential", "mixture", "grid", "closures", "transform", "oz", "stopping", "equations", "anderson",
    "iteration", "newton", "continuation", "thermodynamics", "root", "response", "solution", "sensitivity", "solver",
    "interpolation", "job", "many", "paths", "reference",
]  # fmt: skip
ONLY_IN = {
    "pyfftw": ["ozsolve/transform.py"],
    "matplotlib": ["localcomp/figures/"],
    "typer": ["localcomp/cli/"],
    "rich": ["localcomp/cli/"],
    "sqlite3": ["localcomp/store.py"],
    "distributed": ["localcomp/executors.py"],
}


def sources() -> list[Path]:
    return sorted([*ROOT.glob("ozsolve/**/*.py"), *ROOT.glob("localcomp/**/*.py")])


ALONE = {"reference": ["ozsolve.errors"]}
"""Closed forms share nothing with what they test: these modules may import that, and no module them."""


def imports(source: str, package: str) -> list[tuple[str, list[str]]]:
    """(module, names) of every import, relative ones and `from package import module` spelled out. What only
    type checkers see is left out."""
    found: list[tuple[str, list[str]]] = []
    tree = ast.parse(source)
    typing_only = {
        id(inner)
        for node in ast.walk(tree)
        if isinstance(node, ast.If) and ast.unparse(node.test) in ("TYPE_CHECKING", "typing.TYPE_CHECKING")
        for statement in node.body
        for inner in ast.walk(statement)
    }
    for node in ast.walk(tree):
        if id(node) in typing_only:
            continue
        if isinstance(node, ast.Import):
            found += [(alias.name, []) for alias in node.names]
        elif isinstance(node, ast.ImportFrom):
            above = package.split(".")[: len(package.split(".")) - node.level + 1] if node.level else []
            module = ".".join([*above, *([node.module] if node.module else [])])
            names = [alias.name for alias in node.names]
            if module == "ozsolve" and package == "ozsolve":  # modules, when the engine says so of itself
                found += [(f"ozsolve.{name}", []) for name in names]
            else:
                found.append((module, names))
        elif isinstance(node, ast.Attribute) and isinstance(node.value, ast.Name) and node.value.id == "ozsolve":
            found.append(("ozsolve", [node.attr]))
    return found


def read(path: Path) -> list[tuple[str, list[str]]]:
    name = path.relative_to(ROOT).with_suffix("")
    return imports(path.read_text(encoding="utf-8"), ".".join(name.parts[:-1]))


def violations(path: str, found: list[tuple[str, list[str]]]) -> list[str]:
    bad = []
    for module, names in found:
        top = module.split(".")[0]
        if top in ONLY_IN and not any(path.startswith(allowed) for allowed in ONLY_IN[top]):
            bad.append(f"{path} imports {module}")
        if path.startswith("ozsolve/") and top == "localcomp":
            bad.append(f"{path} imports the application")
        if path.startswith("localcomp/") and top == "ozsolve":
            if module != "ozsolve":
                bad.append(f"{path} imports the private module {module}")
            bad += [
                f"{path} imports ozsolve.{name}, which is not public" for name in names if name not in ozsolve.__all__
            ]
        if path.startswith("localcomp/") and not path.startswith(("localcomp/cli/", "localcomp/__main__")):
            bad += [f"{path} imports the command line"] if module.startswith("localcomp.cli") else []
        own = path.removeprefix("ozsolve/").removesuffix(".py")
        if path.startswith("ozsolve/") and module.startswith("ozsolve.") and own in LADDER:
            other = module.split(".")[1]
            if other not in LADDER or LADDER.index(other) >= LADDER.index(own):
                bad.append(f"{path} imports {other}, which is not below it")
            if other in ALONE:
                bad.append(f"{path} imports {other}, which is for tests")
            if own in ALONE and module not in ALONE[own]:
                bad.append(f"{path} imports {other}, but stands alone")
    return bad


@pytest.mark.parametrize("path", sources(), ids=lambda p: str(p.relative_to(ROOT)))
def test_imports_point_downwards(path: Path) -> None:
    assert violations(str(path.relative_to(ROOT)), read(path)) == []


def test_every_engine_module_is_on_the_ladder() -> None:
    assert {p.stem for p in ROOT.glob("ozsolve/*.py")} - {"__init__"} == set(LADDER)


def test_the_check_sees_an_upward_import() -> None:
    assert violations("ozsolve/grid.py", [("ozsolve.solver", ["solve"])])
    assert violations("ozsolve/grid.py", [("localcomp.units", [])])
    assert violations("localcomp/report.py", [("matplotlib.figure", ["Figure"])])
    assert violations("localcomp/report.py", [("ozsolve.grid", ["Grid"])])
    assert violations("localcomp/report.py", [("localcomp.cli.main", ["app"])])
    assert violations("ozsolve/grid.py", [("pyfftw", [])])
    assert violations("ozsolve/reference.py", [("ozsolve.potential", ["Array"])])
    assert violations("ozsolve/thermodynamics.py", [("ozsolve.reference", ["moments"])])
    assert violations("localcomp/report.py", [("typer", [])])
    assert violations("localcomp/report.py", [("ozsolve", ["Grid"])])
    assert violations("localcomp/report.py", [("ozsolve", ["solve", "Mixture"])]) == []


SPELLINGS = [
    ("from ozsolve.solver import solve", "ozsolve/grid.py"),
    ("from ozsolve import solver", "ozsolve/grid.py"),
    ("from .solver import solve", "ozsolve/grid.py"),
    ("from . import solver", "ozsolve/grid.py"),
    ("import ozsolve.solver", "ozsolve/grid.py"),
    ("def late():\n    from ozsolve.solver import solve", "ozsolve/grid.py"),
    ("import ozsolve\nozsolve.grid.Grid(0.1, 8)", "localcomp/report.py"),
    ("import matplotlib.pyplot as plt", "localcomp/report.py"),
]


@pytest.mark.parametrize(("source", "path"), SPELLINGS)
def test_every_spelling_of_a_wrong_import_is_seen(source: str, path: str) -> None:
    assert violations(path, imports(source, path.split("/")[0]))


def test_imports_for_type_checkers_only_are_free() -> None:
    source = "from typing import TYPE_CHECKING\nif TYPE_CHECKING:\n    from ozsolve.solution import Solution\n"
    assert violations("ozsolve/errors.py", imports(source, "ozsolve")) == []
    assert violations("ozsolve/errors.py", imports(source.replace("if TYPE_CHECKING", "if True"), "ozsolve"))


def test_modules_stay_small() -> None:
    for path in sources():
        assert len(path.read_text(encoding="utf-8").splitlines()) <= 400, path
