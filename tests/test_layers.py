"""The layers: who may import whom, no cycles, third parties by row, and modules of a readable length.

Lazy imports inside functions count; imports for type checking only do not.
"""

from __future__ import annotations

import ast
import graphlib
import os
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parent.parent
PACKAGE = "gcodetool"
ROWS = ("errors", "machine", "program", "motion", "lash", "inspection", "report", "cli")
THIRD_PARTY = {"inspection": {"numpy", "shapely"}, "cli": {"typer", "rich"}}
SUBJECTS = {
    "proof": {
        "curves", "hole_places", "machines", "runs", "verify",
    },
    "measuring": {
        "coupon_tongues", "coupon_vernier", "iso230", "lash_trend", "measure_gcode", "measure_records",
        "measure_targets", "readings", "readings_findings", "residual", "spring_force", "uncertainty",
    },
    "audit": {
        "audit", "audit_records", "clearing", "cutting_records", "durations", "engagement", "features", "findings",
        "force", "job_records", "job_sheet", "labels", "lash_path", "limits", "materials", "outlines", "sizes",
        "spacing", "stock", "swept", "toolpath",
    },
}  # fmt: skip
"""What the modules of inspection are about; a module imports none of another subject."""
RECORDS = {
    f"gcodetool.inspection.{name}" for name in ("audit_records", "cutting_records", "job_records", "measure_records")
}
"""Modules of inspection that hold records only: report may import them."""
SINGLE = {"sheet_keys": "machine", "sheet_edit": "machine", "__main__": "cli"}
"""Modules at the top that belong to a row of another name."""
LONGEST = 400


def modules(root: Path) -> dict[str, Path]:
    """Full module name -> file."""
    found = {}
    for path in sorted((root / PACKAGE).rglob("*.py")):
        parts = path.relative_to(root).with_suffix("").parts
        found[".".join(parts[:-1] if parts[-1] == "__init__" else parts)] = path
    return found


def row(name: str) -> str:
    """The row of a module; the bare package counts with the errors, which is all it may import."""
    parts = name.split(".")
    if len(parts) == 1:
        return "errors"
    return SINGLE.get(parts[1], parts[1])


def imports(name: str, path: Path) -> set[str]:
    """Every name that a module imports at run time, ``from a import b`` as ``a.b``."""
    package = name.split(".") if path.name == "__init__.py" else name.split(".")[:-1]
    found: set[str] = set()
    for node in run_time(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            found.update(alias.name for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            base = package[: len(package) - node.level + 1] if node.level else []
            start = ".".join([*base, *filter(None, [node.module])])
            found.update(f"{start}.{alias.name}" for alias in node.names)
    return found


def run_time(node: ast.AST) -> Iterator[ast.AST]:
    """All nodes but those that only a type checker sees."""
    yield node
    only_types = isinstance(node, ast.If) and ast.unparse(node.test) in ("TYPE_CHECKING", "typing.TYPE_CHECKING")
    for child in node.orelse if only_types else ast.iter_child_nodes(node):
        yield from run_time(child)


def graph(root: Path) -> dict[str, set[str]]:
    """Module -> modules of the package that it imports."""
    known = modules(root)
    edges: dict[str, set[str]] = {}
    for name, path in known.items():
        inside = {target for target in imports(name, path) if target.split(".")[0] == PACKAGE}
        edges[name] = {target if target in known else target.rpartition(".")[0] for target in inside}
    return edges


def subject(module: str) -> str:
    """The subject of a module of inspection; a module that is in no list is a subject of its own."""
    last = module.rpartition(".")[2]
    return next((name for name, members in SUBJECTS.items() if last in members), last)


def wrong_rows(root: Path) -> list[str]:
    found = []
    for name, targets in graph(root).items():
        here = row(name)
        for target in sorted(targets):
            there = row(target)
            if ROWS.index(there) > ROWS.index(here):
                found.append(f"{name} imports {target}, a row below it")
            if here == there == "inspection" and subject(name) != subject(target):
                found.append(f"{name} imports {target}, of another subject")
            if (here, there) == ("report", "inspection") and target not in RECORDS:
                found.append(f"{name} imports {target} at run time")
    return found


def strangers(root: Path) -> list[str]:
    found = []
    for name, path in modules(root).items():
        allowed = THIRD_PARTY.get(row(name), set()) | {PACKAGE, *sys.stdlib_module_names}
        found += [f"{name} imports {target}" for target in imports(name, path) if target.split(".")[0] not in allowed]
    return found


def cycle(root: Path) -> list[str]:
    try:
        graphlib.TopologicalSorter(graph(root)).prepare()
    except graphlib.CycleError as fault:
        return list(fault.args[1])
    return []


def test_every_module_has_a_row() -> None:
    assert [name for name in modules(ROOT) if row(name) not in ROWS] == []


def test_imports_go_up() -> None:
    assert wrong_rows(ROOT) == []


def test_no_cycle() -> None:
    assert cycle(ROOT) == []


def test_third_parties_by_row() -> None:
    assert strangers(ROOT) == []


def test_package_files_are_empty_below_the_top() -> None:
    full = [name for name, path in modules(ROOT).items() if path.name == "__init__.py" and path.stat().st_size]
    assert full == [PACKAGE]


def test_modules_are_short() -> None:
    lengths = {name: path.read_text(encoding="utf-8").count("\n") for name, path in modules(ROOT).items()}
    assert {name: length for name, length in lengths.items() if length > LONGEST} == {}


@pytest.mark.parametrize("start", ["gcodetool", "gcodetool.cli.app", "gcodetool.lash.compensate"])
def test_start_up_and_compensate_load_neither_numpy_nor_shapely(start: str) -> None:
    if start not in modules(ROOT):
        pytest.skip(f"{start} does not exist")
    code = f"import sys, {start}; print([name for name in ('numpy', 'shapely') if name in sys.modules])"
    environment = {**os.environ, "PYTHONPATH": str(ROOT)}
    run = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, env=environment, check=True)
    assert run.stdout == "[]\n"


# The walk itself, on small invented trees.


def tree(folder: Path, files: dict[str, str]) -> Path:
    for name, text in files.items():
        path = folder / PACKAGE / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(text, encoding="utf-8")
    return folder


def test_a_wrong_row_is_found_however_it_is_written(tmp_path: Path) -> None:
    root = tree(
        tmp_path,
        {
            "__init__.py": "",
            "lash/__init__.py": "",
            "lash/play.py": "",
            "motion/a.py": "import gcodetool.lash.play\n",
            "motion/b.py": "from gcodetool.lash import play\n",
            "motion/c.py": "def late():\n    from ..lash.play import anything\n",
            "motion/d.py": "from typing import TYPE_CHECKING\nif TYPE_CHECKING:\n    import gcodetool.lash.play\n",
        },
    )
    assert [line.split()[0][-1] for line in wrong_rows(root)] == ["a", "b", "c"]


def test_neighbours_in_inspection_and_run_time_records_in_report_are_found(tmp_path: Path) -> None:
    files = {
        "inspection/verify.py": "",
        "inspection/audit.py": "from gcodetool.inspection.verify import Result\n",
        "report/tables.py": "from gcodetool.inspection import verify\n",
    }
    assert len(wrong_rows(tree(tmp_path, files))) == 2


def test_a_cycle_is_found(tmp_path: Path) -> None:
    root = tree(tmp_path, {"lash/a.py": "from gcodetool.lash import b\n", "lash/b.py": "import gcodetool.lash.a\n"})
    assert set(cycle(root)) == {"gcodetool.lash.a", "gcodetool.lash.b"}


def test_a_stranger_is_found(tmp_path: Path) -> None:
    root = tree(tmp_path, {"lash/a.py": "import numpy as np\n", "cli/b.py": "import typer, shapely.geometry\n"})
    assert strangers(root) == [
        "gcodetool.cli.b imports shapely.geometry",
        "gcodetool.lash.a imports numpy",
    ]
