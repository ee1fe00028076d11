"""Imports form a ladder: who may import whom, read from the source."""

from __future__ import annotations

import ast
from pathlib import Path

import pytest

import ozsolve

ROOT = Path(__file__).resolve().parents[1]
LADDER = [
    "errors", "potential", "mixture", "grid", "closures", "transform", "oz", "stopping", "equations", "anderson",
    "iteration", "newton", "continuation", "thermodynamics", "root", "response", "solution", "solver",
    "interpolation", "job", "many", "reference",
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


def imports(path: Path) -> list[tuple[str, list[str]]]:
    found = []
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            found += [(alias.name, []) for alias in node.names]
        elif isinstance(node, ast.ImportFrom) and node.module:
            found.append((node.module, [alias.name for alias in node.names]))
    return found


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
    return bad


@pytest.mark.parametrize("path", sources(), ids=lambda p: str(p.relative_to(ROOT)))
def test_imports_point_downwards(path: Path) -> None:
    name = str(path.relative_to(ROOT))
    allowed_up = name == "ozsolve/errors.py"  # names the Solution it carries, for type checkers only
    found = imports(path)
    assert allowed_up or violations(name, found) == []


def test_every_engine_module_is_on_the_ladder() -> None:
    assert {p.stem for p in ROOT.glob("ozsolve/*.py")} - {"__init__"} == set(LADDER)


def test_the_check_sees_an_upward_import() -> None:
    assert violations("ozsolve/grid.py", [("ozsolve.solver", ["solve"])])
    assert violations("ozsolve/grid.py", [("localcomp.units", [])])
    assert violations("localcomp/report.py", [("matplotlib.figure", ["Figure"])])
    assert violations("localcomp/report.py", [("ozsolve.grid", ["Grid"])])
    assert violations("localcomp/report.py", [("localcomp.cli.main", ["app"])])


def test_modules_stay_small() -> None:
    for path in sources():
        assert len(path.read_text(encoding="utf-8").splitlines()) <= 400, path
